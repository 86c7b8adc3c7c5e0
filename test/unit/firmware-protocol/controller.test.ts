import { spawnSync } from "node:child_process";
import { createHash } from "node:crypto";
import { readdirSync, readFileSync } from "node:fs";
import { join } from "node:path";
import { describe, expect, test } from "vitest";
import { packageRoot } from "../../../daemon/paths.ts";
import { crc32 } from "../../../firmware-protocol/crc.ts";
import { seal } from "../../../firmware-protocol/line.ts";
import { readManifest } from "../../../firmware-protocol/manifest.ts";
import { NORTH_CHANNELS, NV_BYTES } from "../../../firmware-protocol/wasm/controller.ts";
import { TestBench, wasmBytes } from "./north.ts";

const room = join(packageRoot, "firmware-protocol");
const sha256 = (bytes: Uint8Array): string => createHash("sha256").update(bytes).digest("hex");

/** Bits of the sample's status word that these tests look at. */
const EMITTING = 0x0001;
const ARMED = 0x0002;
const TRIPPED = 0x0004;
const DELAY = 0x0400;
const statusOf = (bench: TestBench): number => Number.parseInt(bench.sample()[2] ?? "", 16);

describe("the module that is checked in", () => {
  const stated: { compiler: string; sourceHash: string; wasmHash: string } = JSON.parse(
    readFileSync(join(room, "wasm", "controller.json"), "utf8"),
  );

  test("was made from the sources that stand here", () => {
    const files = ["c", "wasm"].flatMap((folder) =>
      readdirSync(join(room, folder))
        .filter((name) => name.endsWith(".c") || (folder === "c" && name.endsWith(".h")))
        .map((name) => `${folder}/${name}`),
    );
    const hash = createHash("sha256");
    for (const file of files.sort()) hash.update(readFileSync(join(room, file)));
    expect(hash.digest("hex"), "run: make -C firmware-protocol/c wasm").toBe(stated.sourceHash);
  });

  test("has the bytes that its note states, and imports nothing", () => {
    expect(sha256(wasmBytes)).toBe(stated.wasmHash);
    expect(WebAssembly.Module.imports(new WebAssembly.Module(wasmBytes))).toEqual([]);
  });

  const compiler = spawnSync("clang-14", ["--version"], { encoding: "utf8" });
  const same = (compiler.stdout ?? "").split("\n")[0] === stated.compiler;
  test.runIf(same)(
    "is what its compiler makes of them, byte for byte",
    () => {
      const made = spawnSync("make", ["-s", "-C", join(room, "c"), "wasm-check"], {
        encoding: "utf8",
      });
      expect(made.stderr + made.stdout).toBe("");
      expect(made.status).toBe(0);
    },
    60_000,
  );
});

describe("introduction", () => {
  test("hello, manifest and its checksum are what a host accepts", () => {
    const bench = new TestBench({ rate_perS: 20, serial: "NORTH-2" });
    expect(bench.lines[0]).toMatch(/^<boot bs-north-1 power /);
    const read = readManifest(bench.say(seal(">who 1")));
    if (!("manifest" in read)) throw new Error(JSON.stringify(read));
    const { manifest } = read;
    expect(manifest.serial).toBe("NORTH-2");
    expect(manifest.rate_perS).toBe(20);
    expect(manifest.absolute_counts).toBe(4400);
    expect(manifest.capabilities).toEqual(["hand", "toggle", "inject"]);
    expect(manifest.channels.map((c) => c.name)).toEqual([...NORTH_CHANNELS]);
    expect(manifest.channels[1]?.perCount).toBeCloseTo(0.16, 12);
  });

  test("a serial that is none, and a memory of another length, are refused", () => {
    expect(() => new TestBench({ serial: "north" })).toThrow(RangeError);
    expect(() => new TestBench({ nv: new Uint8Array(3) })).toThrow(RangeError);
  });
});

describe("from arming to expiry", () => {
  test("no light before the emission delay, then the aim, then dark at tick(n) + term", () => {
    const bench = new TestBench();
    expect(bench.arm()).toBe(true);
    bench.hold(3800, 1200, 100);
    expect(bench.controller.drive_counts).toBe(0);
    expect(bench.controller.indicator).toBe(true);
    expect(statusOf(bench) & (EMITTING | ARMED | DELAY)).toBe(ARMED | DELAY);
    bench.hold(1500, 1200, 100);
    expect(bench.controller.drive_counts).toBe(100);
    expect(bench.controller.enabled).toBe(true);
    expect(statusOf(bench) & (EMITTING | ARMED | DELAY)).toBe(EMITTING | ARMED);
    bench.permit(1200, 100, 500);
    const judged_tick = Number(bench.sample()[1]);
    bench.run(judged_tick + 499 - bench.tick);
    expect(bench.controller.drive_counts).toBe(100);
    bench.step();
    expect(bench.controller.drive_counts).toBe(0);
    expect(bench.controller.enabled).toBe(false);
    bench.run(20);
    expect(statusOf(bench) & (EMITTING | ARMED | TRIPPED)).toBe(TRIPPED);
    expect(bench.sample()[3]).toBe("2");
  });

  test("the drive rises by 200 mA/s, 400 counts of set", () => {
    const bench = new TestBench();
    bench.arm();
    bench.hold(5000, 4400, 100);
    bench.hold(1000, 4400, 4000);
    expect(bench.controller.drive_counts).toBeGreaterThanOrEqual(495);
    expect(bench.controller.drive_counts).toBeLessThanOrEqual(500);
  });

  test("a reset while lit comes up dark and latched; memory carries it to another board", () => {
    const bench = new TestBench();
    bench.arm();
    bench.hold(5000, 1200, 100);
    expect(bench.controller.drive_counts).toBe(100);
    bench.controller.boot("watchdog", bench.tick);
    expect(bench.controller.drive_counts).toBe(0);
    bench.run(40);
    expect(statusOf(bench) & TRIPPED).toBe(TRIPPED);
    expect(bench.sample()[3]).toBe("6");
    const { nv } = bench.controller;
    expect(nv.length).toBe(NV_BYTES);
    const other = new TestBench({ nv });
    expect(statusOf(other) & TRIPPED).toBe(TRIPPED);
    expect(other.sample()[3]).toBe("6");
  });

  test("three bytes 0x18, a break and an opened key cut at once, before any pass", () => {
    const cuts: readonly ((bench: TestBench) => void)[] = [
      (bench) => bench.controller.receive(Uint8Array.of(0x18, 0x18, 0x18)),
      (bench) => bench.controller.receiveBreak(),
      (bench) => bench.controller.inputs(false, true, true, false),
    ];
    for (const cut of cuts) {
      const bench = new TestBench();
      bench.arm();
      bench.hold(5000, 1200, 100);
      expect(bench.controller.drive_counts).toBe(100);
      cut(bench);
      expect(bench.controller.drive_counts).toBe(0);
      expect(bench.controller.enabled).toBe(false);
      bench.hold(500, 1200, 100);
      expect(bench.controller.drive_counts).toBe(0);
    }
  });

  test("more bytes at once than the ring holds are not lost", () => {
    const bench = new TestBench();
    const before = bench.lines.length;
    const line = `${seal(">reset 2")}\n`;
    bench.controller.receive(Buffer.from(line.repeat(100), "latin1"));
    bench.run(2);
    const answers = bench.lines.slice(before).filter((text) => text.startsWith("<no reset state"));
    expect(answers.length).toBe(100);
  });
});

/**
 * 10,000 steps of a session with a warm spell, a lost host, a reset by name and a second session:
 * all that left the board, and what it drove, at every step. It tells when the core's behaviour
 * changed, whatever compiler made the module.
 */
test("the trace of 10,000 steps", () => {
  const bench = new TestBench();
  const trace: number[] = [];
  const note = (): void => {
    const { drive_counts, enabled, indicator } = bench.controller;
    trace.push(drive_counts & 0xff, drive_counts >> 8, (enabled ? 1 : 0) | (indicator ? 2 : 0));
  };
  bench.arm();
  for (let step = 0; step < 10_000; step += 1) {
    const silent = step > 6000 && step < 6600;
    if (step % 100 === 0 && !silent) bench.permit(1200, 200 + (step >> 5), 500);
    if (step === 5000) bench.values[2] = 4327;
    if (step === 5500) bench.values[2] = 9000;
    if (step === 7000) bench.say(seal(">reset 2"));
    if (step === 7100) bench.arm();
    bench.step();
    note();
  }
  const text = Buffer.from(bench.lines.join("\n"), "latin1");
  expect(bench.lines.some((line) => line.startsWith("<no permit session"))).toBe(true);
  expect([crc32(Uint8Array.from(trace)), crc32(text)]).toEqual([750130547, 2978573905]);
});
