import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import type { FastifyInstance } from "fastify";
import { afterEach, beforeEach, describe, expect, test } from "vitest";
import { Live } from "../../../daemon/desk/live.ts";
import { buildServer } from "../../../daemon/desk/server.ts";
import { SignIn } from "../../../daemon/desk/sign-in.ts";
import { snapshotOf } from "../../browser/story.ts";

const TOKEN = "m".repeat(43);
const CODE = "one-time-code-0002";

let folder = "";
let app: FastifyInstance;
let live: Live;
let asked = 0;

beforeEach(async () => {
  folder = mkdtempSync(join(tmpdir(), "beamsitter-metrics-"));
  mkdirSync(join(folder, "assets"));
  writeFileSync(join(folder, "index.html"), "the page");
  const sign = new SignIn(TOKEN);
  sign.offer(CODE);
  live = new Live();
  asked = 0;
  const ask = () => {
    asked++;
    return Promise.resolve({ id: 1, ok: true, reason: "", words: "" });
  };
  app = await buildServer({
    config: { host: "127.0.0.1", darkPort: 0, names: [] },
    ...{ pages: folder, sign, live },
    line: { connected: true, ask },
    record: { series: () => Promise.reject(new Error("not asked here")), events: () => [] },
    waiting: () => 1234,
  });
});
afterEach(async () => {
  live.close();
  await app.close();
  rmSync(folder, { recursive: true, force: true });
});

const host = "127.0.0.1";
const scrape = (headers: Record<string, string> = { authorization: `Bearer ${TOKEN}` }) =>
  app.inject({ url: "/metrics", headers: { host, ...headers } });

/** Samples by name and labels. */
const samplesOf = (text: string): Map<string, number> =>
  new Map(
    text
      .split("\n")
      .filter((line) => line !== "" && !line.startsWith("#"))
      .map((line) => [
        line.slice(0, line.lastIndexOf(" ")),
        Number(line.slice(line.lastIndexOf(" "))),
      ]),
  );

describe("the page for scrapers", () => {
  test("is OpenMetrics text in base units, and asks nothing of the bench", async () => {
    const snapshot = { ...snapshotOf("near", 1000), case_degC: null };
    live.line(true);
    live.take({ push: "snapshot", snapshot });
    const { statusCode, headers, body } = await scrape();
    expect(statusCode).toBe(200);
    expect(headers["content-type"]).toBe(
      "application/openmetrics-text; version=1.0.0; charset=utf-8",
    );
    expect(body.endsWith("# EOF\n")).toBe(true);
    const samples = samplesOf(body);
    const bench = `{bench="${snapshot.bench}"}`;
    expect(samples.get(`beamsitter_current_amperes${bench}`)).toBeCloseTo(
      (snapshot.current_mA ?? 0) / 1000,
      9,
    );
    expect(samples.get(`beamsitter_ceiling_amperes${bench}`)).toBeCloseTo(
      (snapshot.ceiling_mA ?? 0) / 1000,
      9,
    );
    expect(samples.get(`beamsitter_second_home_waiting_samples${bench}`)).toBe(1234);
    expect(samples.get(`beamsitter_state{bench="${snapshot.bench}",state="emitting"}`)).toBe(1);
    expect(samples.get(`beamsitter_state{bench="${snapshot.bench}",state="standby"}`)).toBe(0);
    // What is not known is left out: a zero would be a reading.
    expect(body).not.toContain("case_celsius");
    expect(asked).toBe(0);
  });

  test("without a line to the judge says that, and no old values", async () => {
    live.line(true);
    live.take({ push: "snapshot", snapshot: snapshotOf("near", 1000) });
    live.line(false);
    const { body } = await scrape();
    expect(body).not.toContain("amperes");
  });

  test("needs the token: neither nobody nor a signed-in browser is let in", async () => {
    expect((await scrape({})).statusCode).toBe(401);
    expect((await scrape({ authorization: "Bearer wrong" })).statusCode).toBe(401);
    const signed = await app.inject({ url: `/sign?code=${CODE}`, headers: { host } });
    const cookie = String(signed.headers["set-cookie"]).split(";")[0] ?? "";
    expect((await scrape({ cookie })).statusCode).toBe(401);
  });
});
