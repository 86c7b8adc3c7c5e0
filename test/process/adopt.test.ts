import { readFileSync } from "node:fs";
import { join } from "node:path";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import type { EventLine } from "../../daemon/control/api.ts";
import { SwitchClient } from "../../daemon/control/client.ts";
import type { SeriesJson } from "../../daemon/desk/series.ts";
import { wall } from "../../daemon/model/times.ts";
import { assetFile } from "../../daemon/paths.ts";
import { openReader } from "../../daemon/record/reader.ts";
import { Daemon, Place, runCli } from "./daemon.ts";

const NORTH = readFileSync(assetFile("daemon/bench-file/benches/north.yaml"), "utf8");
/** A lower roof at every case temperature, and a case sensor that was calibrated anew: warmer. */
const LOWER = NORTH.replace("current: 2.10 A", "current: 1.00 A")
  .replace("current: 1.54 A", "current: 0.90 A")
  .replace("r25: 10 kohm", "r25: 11 kohm");
const READY_ms = 60_000;

let place: Place;
let daemon: Daemon;
let watcher: SwitchClient;
const events: EventLine[] = [];
const folder = (): string => join(place.folder, "data", "beamsitter", "north");

beforeAll(async () => {
  place = new Place();
  daemon = await Daemon.start(place, "north", "--stay-dark");
  watcher = await SwitchClient.connect(
    join(place.env.XDG_RUNTIME_DIR ?? "", "beamsitter", "north.socket"),
  );
  await watcher.watch((push) => {
    if (push.push === "event") events.push(push.event);
  });
  await daemon.until((s) => s.link.phase === "ready", READY_ms);
});
afterAll(async () => {
  watcher.close();
  await daemon.signal("SIGKILL");
  place.remove();
});

const adopt = (text: string, ...args: string[]) =>
  runCli(place, "adopt", place.file("changed.yaml", text), ...args);

/** What the desk tells of the case in a window that has passed, as a script asks. */
async function caseSeries({ from, to }: { from: number; to: number }): Promise<SeriesJson> {
  const token = readFileSync(join(folder(), "token"), "utf8").trim();
  const query = `channels=case&from=${from}&to=${to}&pixels=10`;
  const answer = await fetch(`${new URL(daemon.address).origin}/api/series?${query}`, {
    headers: { authorization: `Bearer ${token}` },
  });
  expect(answer.status).toBe(200);
  return (await answer.json()) as SeriesJson;
}

function meanOf({ channels }: SeriesJson): number {
  const means = (channels.case?.mean ?? []).filter((m) => m !== null);
  expect(means.length).toBeGreaterThan(0);
  return means.reduce((sum, m) => sum + m, 0) / means.length;
}

describe("adopt", () => {
  test("the same file: nothing differs, nothing is done", async () => {
    const { code, stdout } = await adopt(NORTH);
    expect(code).toBe(0);
    expect(stdout).toContain("Nothing differs from the file in use.");
  });

  test("a file with errors: all of them are listed, with their places", async () => {
    const broken = NORTH.replace("threshold: 0.40 A ", "threshold: 0.40 ").replace(
      "current: 1.9 A ",
      "current: 1.9 kg ",
    );
    const { code, stdout } = await adopt(broken, "--confirm", "adopt");
    expect(code).toBe(1);
    expect(stdout).toContain("This file cannot be used:");
    expect(stdout).toMatch(/:\d+:\d+ {2}error {2}diode\.threshold/);
    expect(stdout).toMatch(/:\d+:\d+ {2}error {2}limits\.current/);
  });

  test("another bench's file is refused, both names told", async () => {
    const { code, stdout } = await adopt(NORTH.replace("bench: north ", "bench: south "));
    expect(code).toBe(1);
    expect(stdout).toContain('This file describes "south"; this daemon runs "north".');
  });

  test("what only a start can change is refused", async () => {
    const { code, stdout } = await adopt(NORTH.replace("rate: 50 /s", "rate: 25 /s"));
    expect(code).toBe(1);
    expect(stdout).toContain("These change only when the daemon starts");
    expect(stdout).toContain("controller.rate goes from");
  });

  test("without somebody to confirm: the difference in words, and nothing is changed", async () => {
    const { code, stdout, stderr } = await adopt(LOWER);
    expect(code).toBe(2);
    expect(stdout).toContain("derating goes from");
    expect(stdout).toContain("channels.case goes from");
    expect(stderr).toContain("--confirm adopt");
    expect((await daemon.snapshot()).ceiling_mA).toBeGreaterThan(1500);
  });

  test("while armed: refused", async () => {
    const armed = await runCli(place, "arm", "0.8 A", "--confirm", "0.8A", "--json");
    expect(JSON.parse(armed.stdout)).toMatchObject({ ok: true });
    const { code, stdout } = await adopt(LOWER, "--confirm", "adopt");
    expect(code).toBe(1);
    expect(stdout).toContain("a bench file is adopted only while dark.");
    await runCli(place, "dark");
    await daemon.until((s) => s.state === "standby", READY_ms);
  });

  test("while dark: in use at once, on the board, in the desk and in the record", async () => {
    const before = events.length;
    const window_ms = { from: Date.now() - 60_000, to: Date.now() };
    const earlier = await caseSeries(window_ms);
    const { code, stdout } = await adopt(LOWER, "--confirm", "adopt", "--json");
    expect(code).toBe(0);
    expect(JSON.parse(stdout)).toMatchObject({ ok: true, adopted: true });
    const s = await daemon.until((x) => (x.ceiling_mA ?? 1e9) < 1010, READY_ms);
    expect(s.ceiling_mA).toBeGreaterThan(900);
    await daemon.until((x) => x.link.phase === "ready", READY_ms);
    const told = events.slice(before).map((e) => [e.kind, e.hazard]);
    expect(told).toContainEqual(["adopted", ""]);
    expect(told).toContainEqual(["link", "curve-loaded"]);
    const refused = await runCli(place, "arm", "1.2A", "--confirm", "1.2A");
    expect(refused.code).toBe(1);
    expect(refused.stdout).toContain("is above the ceiling");

    expect(meanOf(await caseSeries(window_ms))).toBeGreaterThan(meanOf(earlier) + 1);

    expect(await daemon.signal("SIGTERM")).toBe(0);
    const reader = openReader(folder());
    const window = { from: wall(0), to: wall(Date.now() + 60_000) };
    const adopted = reader.events(window).find((e) => e.kind === "adopted");
    const text = reader.lastBenchText();
    reader.close();
    expect(String(adopted?.data.words)).toContain("derating goes from");
    expect(text).toBe(LOWER);
  });
});
