import { type ChildProcess, spawn } from "node:child_process";
import { existsSync, readFileSync } from "node:fs";
import { join } from "node:path";
import { afterAll, beforeAll, describe, expect, test, vi } from "vitest";
import { wall } from "../../daemon/model/times.ts";
import { assetFile } from "../../daemon/paths.ts";
import { openReader, type RecordReader } from "../../daemon/record/reader.ts";
import { ScpiServer } from "../unit/link/scpi-server.ts";
import { Daemon, Place, runCli } from "./daemon.ts";

const WAIT = { timeout: 60_000, interval: 50 };
const NORTH = readFileSync(assetFile("daemon/bench-file/benches/north.yaml"), "utf8");
let place: Place;
let meter: ScpiServer;
let wire: ChildProcess;
let daemon: Daemon;

/** The same small meter twice: over TCP, and behind a pseudo-terminal that stands for a port. */
beforeAll(async () => {
  place = new Place();
  meter = await ScpiServer.start();
  const port = join(place.folder, "meter");
  wire = spawn("socat", [`pty,raw,echo=0,link=${port}`, `tcp:127.0.0.1:${meter.port}`]);
  await vi.waitFor(() => expect(existsSync(port)).toBe(true), WAIT);
  const file = place.file(
    "bench.yaml",
    `${NORTH}
witness:
  near: { address: "tcp://127.0.0.1:${meter.port}", query: "MEAS:POW?", period: 200 ms }
  wired:
    address: "serial:${port}"
    query: "MEAS:POW?"
    period: 200 ms
    calibrated: 2024-01-31
    due: 2025-01-31
`,
  );
  daemon = await Daemon.start(place, "north", "--bench", file, "--stay-dark");
});
afterAll(async () => {
  await daemon?.signal("SIGKILL");
  wire?.kill("SIGKILL");
  await meter?.stop();
  place?.remove();
});

const folder = (): string => join(place.folder, "data", "beamsitter", "north");
const ALL = { from: wall(0), to: wall(1e15) };

/** What the record says now. */
function recorded<T>(look: (reader: RecordReader) => T): T {
  const reader = openReader(folder());
  try {
    return look(reader);
  } finally {
    reader.close();
  }
}

describe("witnesses of a running daemon", () => {
  test("over TCP and over a port: recorded in the held unit, with who they are", async () => {
    for (const name of ["near", "wired"]) {
      await vi.waitFor(() => {
        const readings = recorded((reader) => reader.readings("north"));
        const [first, second] = readings.filter((reading) => reading.name === name);
        expect(first).toMatchObject({ unit: "mW", typed: false });
        expect(first?.value).toBeCloseTo(1830, 6);
        expect(first?.note).toContain("Made up,Meter,0,1.0");
        expect(second?.note).toBe("");
      }, WAIT);
    }
  });

  test("its calibration is kept beside its readings; an overdue one is told", async () => {
    const readings = recorded((reader) => reader.readings("north"));
    const first = readings.find((reading) => reading.name === "wired");
    expect(first?.note).toContain("calibrated 2024-01-31, due 2025-01-31");
    await vi.waitFor(() => {
      const events = recorded((reader) => reader.events(ALL));
      const words = events.map((event) => event.data.words);
      expect(words).toContain("Witness wired: its calibration was due on 2025-01-31.");
      expect(words).toContain("Witness near: it answers; its readings are recorded.");
    }, WAIT);
  });

  test("a typed reading and a change by hand go through the running recorder", async () => {
    const read = await runCli(place, "reading", "1.83", "W", "--note", "by hand", "--who", "lab");
    expect(read).toMatchObject({ code: 0, stderr: "" });
    expect(read.stdout).toContain("1830 mW");
    const change = ["change", "diode", "threshold=0.42A", "--serial", "D-17", "--who", "lab"];
    expect(await runCli(place, ...change)).toMatchObject({ code: 0, stderr: "" });
    const listed = await runCli(place, "change", "--list", "--json");
    expect(JSON.parse(listed.stdout)).toMatchObject([
      { bench: "north", part: "diode", serial: "D-17", values: { threshold: "0.42A" } },
    ]);
    const kinds = recorded((reader) => reader.events(ALL)).map((event) => event.kind);
    expect(kinds).toEqual(expect.arrayContaining(["reading", "epoch"]));
  });

  test.each([
    ["no part", ["change", "lamp"], 2],
    ["a value without its unit", ["change", "diode", "threshold=0.42"], 2],
    ["no number", ["reading", "bright"], 2],
    ["a number without its unit", ["reading", "1.83"], 2],
  ])("%s is refused, and nothing is kept", async (_what, line, code) => {
    const before = recorded((reader) => [reader.epochs().length, reader.events(ALL).length]);
    const ended = await runCli(place, ...line);
    expect(ended.code).toBe(code);
    expect(ended.stderr).toContain("Nothing was changed.");
    expect(recorded((reader) => reader.epochs().length)).toBe(before[0]);
  });
});

test("without a daemon, the same code keeps them under the folder's lock", async () => {
  await daemon.signal("SIGINT");
  const change = ["change", "mount", "--note", "screws tightened", "--on", "north"];
  expect(await runCli(place, ...change)).toMatchObject({ code: 0, stderr: "" });
  expect(recorded((reader) => reader.epochs().map(({ part }) => part))).toEqual(["diode", "mount"]);
});
