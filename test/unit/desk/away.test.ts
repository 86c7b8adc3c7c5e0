import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import type { FastifyInstance } from "fastify";
import { afterEach, beforeEach, describe, expect, test } from "vitest";
import type { Question } from "../../../daemon/control/client.ts";
import { Live } from "../../../daemon/desk/live.ts";
import { buildServer } from "../../../daemon/desk/server.ts";
import { SignIn } from "../../../daemon/desk/sign-in.ts";

const TOKEN = "k".repeat(43);
const CODE = "one-time-code-0001";
/** From the range for documentation, RFC 5737. */
const AWAY = "192.0.2.7";
const HOST = "192.0.2.1:7808";

let folder = "";
let asked: Question[] = [];
let live: Live;
let app: FastifyInstance;

/** A desk that listens on every address; requests are handed in with the address they came from. */
beforeEach(async () => {
  folder = mkdtempSync(join(tmpdir(), "beamsitter-away-"));
  mkdirSync(join(folder, "assets"));
  writeFileSync(join(folder, "index.html"), "the page");
  asked = [];
  live = new Live();
  const sign = new SignIn(TOKEN);
  sign.offer(CODE);
  app = await buildServer({
    config: { host: "0.0.0.0", darkPort: 0, names: [] },
    pages: folder,
    sign,
    live,
    line: {
      connected: true,
      ask: async (question) => {
        asked.push(question);
        return { id: 1, ok: true, reason: "", words: "Done." };
      },
    },
    record: {
      series: async () => ({ channels: {}, gaps: [], step_ms: 0 }),
      events: () => [],
    },
  });
});
afterEach(async () => {
  live.close();
  await app.close();
  rmSync(folder, { recursive: true });
});

const send = (method: "GET" | "POST", url: string, headers: Record<string, string>, body = "") =>
  app.inject({
    method,
    url,
    remoteAddress: AWAY,
    headers: { host: HOST, ...headers },
    ...(body === "" ? {} : { payload: body }),
  });

const FORM = { "content-type": "application/x-www-form-urlencoded", origin: `http://${HOST}` };

describe("a page on another machine", () => {
  test("is asked for the token, and a code from an address does not do", async () => {
    const page = await send("GET", "/", {});
    expect(page.statusCode).toBe(401);
    expect(page.body).toContain("Paste the token");
    expect((await send("GET", `/sign?code=${CODE}`, {})).statusCode).toBe(401);
    expect((await send("GET", "/api/snapshot", {})).statusCode).toBe(401);
  });

  test("signs in with the token, and asks as one that is away", async () => {
    expect((await send("POST", "/sign", FORM, "token=wrong")).statusCode).toBe(401);
    const signed = await send("POST", "/sign", FORM, `token=${TOKEN}`);
    expect(signed.statusCode).toBe(303);
    const cookie = `${signed.headers["set-cookie"]}`.split(";")[0] ?? "";
    const json = { "content-type": "application/json", origin: `http://${HOST}`, cookie };
    await send("POST", "/api/arm", json, JSON.stringify({ current_mA: 500 }));
    expect(asked).toEqual([{ verb: "arm", current_mA: 500, asker: "away" }]);
  });

  test("a script that is away is away too", async () => {
    const headers = { authorization: `Bearer ${TOKEN}`, "content-type": "application/json" };
    await send("POST", "/api/set", headers, JSON.stringify({ current_mA: 500 }));
    expect(asked).toEqual([{ verb: "set", current_mA: 500, asker: "away" }]);
  });

  test("no header makes it a page of this machine", async () => {
    const headers = {
      authorization: `Bearer ${TOKEN}`,
      "content-type": "application/json",
      "x-forwarded-for": "127.0.0.1",
    };
    await send("POST", "/api/arm", headers, JSON.stringify({ current_mA: 500 }));
    expect(asked).toEqual([{ verb: "arm", current_mA: 500, asker: "away" }]);
  });
});
