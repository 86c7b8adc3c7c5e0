import { readFileSync } from "node:fs";
import { afterEach, beforeAll, describe, expect, test } from "vitest";
import { packageRoot } from "../../daemon/paths.ts";
import { seal } from "../../firmware-protocol/line.ts";
import { CURVE, emittingBoard, type Host } from "./host.ts";
import { buildSimulator } from "./simulator.ts";

const MAKEFILE = `${packageRoot}/firmware-protocol/boards/atmega328p/Makefile`;

let said = "";
let host: Host | null = null;

beforeAll(() => {
  said = buildSimulator();
});
afterEach(() => host?.world.stop());

describe("what the firmware takes", () => {
  test("is under 24 KiB of flash and 1.5 KiB of memory", () => {
    const found = /flash (\d+) of (\d+) bytes, memory (\d+) of (\d+) bytes/.exec(said);
    const [flash, flash_max, memory, memory_max] = (found ?? []).slice(1).map(Number);
    expect(flash_max).toBe(24 * 1024);
    expect(memory_max).toBe(1536);
    expect(flash).toBeGreaterThan(8000);
    expect(flash).toBeLessThan(24 * 1024);
    expect(memory).toBeGreaterThan(800);
    expect(memory).toBeLessThanOrEqual(1536);
  });

  test("stack at its deepest is what the Makefile allows for", async () => {
    host = await emittingBoard();
    const { world } = host;
    host.wish = { cap: 900, aim: 900, term: 500 };
    await world.chip.command("case 45");
    for (const line of ["x".repeat(170), ">status", ">readback 3", ">ask inject", ">dark"]) {
      world.sendLine(line.startsWith(">") ? seal(line) : line);
      await world.pass(100);
    }
    host.wish = null;
    await host.introduce();
    await host.ask(">reset 4", "yes");
    await host.loadCurve(CURVE);
    await host.arm();
    await world.pass(2500); // no permit comes: a trip from armed
    const [deepest] = (await world.chip.command("stack")).map(Number);
    const allowed = Number(/^STACK_BYTES = (\d+)$/m.exec(readFileSync(MAKEFILE, "utf8"))?.[1]);
    expect(deepest).toBeGreaterThan(60);
    expect(deepest).toBeLessThanOrEqual(allowed);
  });
});
