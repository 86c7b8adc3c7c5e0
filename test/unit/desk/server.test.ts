import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { request } from "node:http";
import type { AddressInfo } from "node:net";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterEach, beforeEach, describe, expect, test } from "vitest";
import { WebSocket } from "ws";
import type { SwitchAnswer } from "../../../daemon/control/api.ts";
import type { Question } from "../../../daemon/control/client.ts";
import { Live } from "../../../daemon/desk/live.ts";
import { buildServer } from "../../../daemon/desk/server.ts";
import { SignIn } from "../../../daemon/desk/sign-in.ts";
import type { SeriesQuery } from "../../../daemon/model/series.ts";
import { snapshotOf } from "../../browser/story.ts";

const TOKEN = "k".repeat(43);
const CODE = "one-time-code-0001";

let folder = "";
let base = "";
let asked: Question[] = [];
let queries: SeriesQuery[] = [];
let answer: SwitchAnswer;
let live: Live;
let close: () => Promise<void>;

beforeEach(async () => {
  folder = mkdtempSync(join(tmpdir(), "beamsitter-desk-"));
  mkdirSync(join(folder, "assets"));
  writeFileSync(join(folder, "index.html"), '<meta content="__DARK_PORT__">the page');
  asked = [];
  queries = [];
  answer = { id: 1, ok: true, reason: "", words: "Done." };
  const sign = new SignIn(TOKEN);
  sign.offer(CODE);
  live = new Live();
  const app = await buildServer({
    config: { host: "127.0.0.1", darkPort: 4321, names: [] },
    pages: folder,
    sign,
    live,
    line: {
      connected: true,
      ask: async (question) => {
        asked.push(question);
        return answer;
      },
    },
    record: {
      series: async (query) => {
        queries.push(query);
        const v = Float64Array.of(1, Number.NaN);
        return {
          channels: { current: { t: v, min: v, mean: v, max: v, n: v } },
          gaps: [],
          step_ms: 0,
        };
      },
      events: () => [],
    },
  });
  await app.listen({ host: "127.0.0.1", port: 0 });
  const { port } = app.server.address() as AddressInfo;
  sign.nameCookieFor(port);
  base = `http://127.0.0.1:${port}`;
  close = async () => {
    live.close();
    await app.close();
  };
});

afterEach(async () => {
  await close();
  rmSync(folder, { recursive: true });
});

const get = (path: string, headers: Record<string, string> = {}): Promise<Response> =>
  fetch(base + path, { headers, redirect: "manual" });

const bearer = { authorization: `Bearer ${TOKEN}` };

async function cookie(): Promise<string> {
  const response = await get(`/sign?code=${CODE}`);
  return (response.headers.get("set-cookie") ?? "").split(";")[0] ?? "";
}

const post = (path: string, body: unknown, headers: Record<string, string>): Promise<Response> =>
  fetch(base + path, {
    method: "POST",
    headers: { "content-type": "application/json", ...headers },
    body: JSON.stringify(body),
  });

describe("signing in", () => {
  test("without a cookie the page says how, and shows nothing else", async () => {
    const response = await get("/");
    expect(response.status).toBe(401);
    const text = await response.text();
    expect(text).toContain("beamsitter open");
    expect(text).not.toContain("the page");
    expect(response.headers.get("content-security-policy")).toContain("script-src 'self'");
  });

  test("a code becomes a cookie once, and the page carries its dark port", async () => {
    const first = await get(`/sign?code=${CODE}`);
    expect(first.status).toBe(303);
    expect(first.headers.get("location")).toBe("/");
    const mine = (first.headers.get("set-cookie") ?? "").split(";")[0] ?? "";
    const page = await (await get("/", { cookie: mine })).text();
    expect(page).toContain('content="4321"');
    const second = await get(`/sign?code=${CODE}`);
    expect(second.status).toBe(401);
    expect(second.headers.get("set-cookie")).toBeNull();
    const same = await get(`/sign?code=${CODE}`, { cookie: mine });
    expect(same.status).toBe(303);
  });

  test("the token signs a page in too, a wrong one does not", async () => {
    const form = { "content-type": "application/x-www-form-urlencoded" };
    const send = (token: string): Promise<Response> =>
      fetch(`${base}/sign`, {
        method: "POST",
        headers: form,
        body: `token=${token}`,
        redirect: "manual",
      });
    expect((await send("wrong")).status).toBe(401);
    expect((await send(TOKEN)).headers.get("set-cookie")).toContain("SameSite=Strict");
  });

  test.each(["/api/snapshot", "/api/series?channels=current&from=1&to=2&pixels=1", "/api/events"])(
    "%s tells nothing to a stranger",
    async (path) => {
      expect((await get(path)).status).toBe(401);
      expect((await get(path, { authorization: "Bearer wrong" })).status).toBe(401);
      expect(queries).toEqual([]);
    },
  );
});

describe("the guard", () => {
  test("a borrowed host name is refused before anything else", async () => {
    const { port } = new URL(base);
    const status = await new Promise<number>((resolve, reject) => {
      import("node:http").then(({ request }) =>
        request(
          { host: "127.0.0.1", port, path: "/", headers: { host: `evil.example:${port}` } },
          (response) => resolve(response.resume().statusCode ?? 0),
        )
          .on("error", reject)
          .end(),
      );
    });
    expect(status).toBe(421);
  });

  test("another site's page can neither read nor act, with the cookie or without", async () => {
    const headers = { cookie: await cookie(), origin: "http://evil.example" };
    expect((await get("/api/snapshot", headers)).status).toBe(403);
    expect((await post("/api/arm", { current_mA: 100 }, headers)).status).toBe(403);
    expect(asked).toEqual([]);
  });

  test("a cookie acts only with an origin; the token needs none", async () => {
    expect((await post("/api/dark", {}, { cookie: await cookie() })).status).toBe(403);
    expect((await post("/api/dark", {}, bearer)).status).toBe(200);
    expect(asked).toEqual([{ verb: "dark", asker: "script" }]);
  });
});

/** A request whose address goes out exactly as it is written here; fetch would tidy it up. */
const raw = (method: string, path: string, headers: Record<string, string>): Promise<number> =>
  new Promise((resolve, reject) => {
    const { port } = new URL(base);
    request({ host: "127.0.0.1", port, method, path, headers }, (response) =>
      resolve(response.resume().statusCode ?? 0),
    )
      .on("error", reject)
      .end(method === "POST" ? JSON.stringify({ current_mA: 100, cause: "person" }) : "");
  });

describe("an address written otherwise", () => {
  const json = { "content-type": "application/json" };

  test.each([
    ["POST", "/%61pi/arm"],
    ["POST", "/ap%69/set"],
    ["POST", "/%61%70%69/reset"],
    ["POST", "http://127.0.0.1/api/arm"],
    ["POST", "https://any.example/api/reset"],
    ["GET", "/%61pi/snapshot"],
    ["GET", "http://127.0.0.1/api/events"],
    ["HEAD", "/%61pi/snapshot"],
  ])("%s %s needs a sign-in like its plain form, and asks nobody", async (method, path) => {
    expect(await raw(method, path, json)).toBe(401);
    expect(await raw(method, path, { ...json, authorization: "Bearer wrong" })).toBe(401);
    expect(asked).toEqual([]);
  });

  test("a cookie without an origin does not act by it either", async () => {
    const headers = { ...json, cookie: await cookie() };
    expect(await raw("POST", "/%61pi/arm", headers)).toBe(403);
    expect(asked).toEqual([]);
  });
});

describe("asking", () => {
  test("a page arms, sets, resets and goes dark as a page", async () => {
    const headers = { cookie: await cookie(), origin: base };
    await post("/api/arm", { current_mA: 1200 }, headers);
    await post("/api/set", { current_mA: 900 }, headers);
    await post("/api/reset", { cause: "loop-open" }, headers);
    await fetch(`${base}/api/dark`, { method: "POST", headers });
    expect(asked).toEqual([
      { verb: "arm", current_mA: 1200, asker: "page" },
      { verb: "set", current_mA: 900, asker: "page" },
      { verb: "reset", cause: "loop-open", asker: "page" },
      { verb: "dark", asker: "page" },
    ]);
  });

  test("a refusal comes back in its words with 409, a silent switch with 503", async () => {
    answer = { id: 1, ok: false, reason: "above-ceiling", words: "Too much.", highest_mA: 1690 };
    const refused = await post("/api/arm", { current_mA: 1920 }, bearer);
    expect(refused.status).toBe(409);
    expect(await refused.json()).toMatchObject({ words: "Too much.", highest_mA: 1690 });
    answer = { ...answer, reason: "no-answer" };
    expect((await post("/api/dark", {}, bearer)).status).toBe(503);
  });

  test.each([
    ["/api/arm", {}],
    ["/api/arm", { current_mA: "1200" }],
    ["/api/arm", { current_mA: -1 }],
    ["/api/arm", { current_mA: 1200, asker: "person" }],
    ["/api/set", { current_mA: null }],
    ["/api/reset", { cause: "" }],
  ])("%s with %o is refused in words and asks nobody", async (path, body) => {
    const response = await post(path, body, bearer);
    expect(response.status).toBe(400);
    expect(((await response.json()) as { words: string }).words).toMatch(/^Send /);
    expect(asked).toEqual([]);
  });

  test("broken JSON and a body beyond the limit end in words, not in a fault", async () => {
    const send = (body: string): Promise<Response> =>
      fetch(`${base}/api/arm`, {
        method: "POST",
        headers: { "content-type": "application/json", ...bearer },
        body,
      });
    expect((await send("{")).status).toBe(400);
    expect((await send(`"${"x".repeat(5000)}"`)).status).toBe(413);
  });
});

describe("the record", () => {
  test("a question is passed on, and what is not known becomes null", async () => {
    live.take({ push: "snapshot", snapshot: snapshotOf("calm", 1000) });
    const path = "/api/series?channels=current,case&from=10&to=20&pixels=300";
    const json = (await (await get(path, bearer)).json()) as { channels: object };
    expect(queries[0]).toEqual({
      bench: "north",
      channels: ["current", "case"],
      window: { from: 10, to: 20 },
      pixels: 300,
    });
    expect(json.channels).toMatchObject({ current: { mean: [1, null] } });
  });

  test.each([
    "channels=&from=1&to=2&pixels=9",
    "channels=a&from=2&to=1&pixels=9",
    "channels=a&from=x&to=1&pixels=9",
    "channels=a&from=1&to=2&pixels=0",
    "channels=a;b&from=1&to=2&pixels=9",
  ])("?%s is refused in words", async (query) => {
    const response = await get(`/api/series?${query}`, bearer);
    expect(response.status).toBe(400);
    expect(((await response.json()) as { words: string }).words).toMatch(/\.$/);
    expect(queries).toEqual([]);
  });
});

describe("the live stream", () => {
  const messages = (headers: Record<string, string>): Promise<unknown[]> =>
    new Promise((resolve, reject) => {
      const socket = new WebSocket(`${base.replace("http", "ws")}/api/live`, { headers });
      const got: unknown[] = [];
      socket.on("unexpected-response", (_request, response) =>
        reject(new Error(`${response.statusCode}`)),
      );
      socket.on("error", reject);
      socket.on("message", (data) => {
        got.push(JSON.parse(`${data}`));
        if (got.length < 2) return;
        socket.close();
        resolve(got);
      });
    });

  test("begins with the state of the line and the newest snapshot", async () => {
    live.line(true);
    live.take({ push: "snapshot", snapshot: snapshotOf("calm", 1000) });
    const got = await messages({ cookie: await cookie(), origin: base });
    expect(got[0]).toEqual({ push: "line", connected: true });
    expect(got[1]).toMatchObject({ push: "snapshot", snapshot: { bench: "north" } });
  });

  test("is closed to strangers, and to a cookie from another site or from nowhere", async () => {
    const mine = await cookie();
    await expect(messages({})).rejects.toThrow("401");
    await expect(messages({ cookie: mine, origin: "http://evil.example" })).rejects.toThrow("403");
    await expect(messages({ cookie: mine })).rejects.toThrow("403");
  });
});
