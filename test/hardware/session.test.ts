import { afterEach, beforeAll, describe, expect, test } from "vitest";
import { seal } from "../../firmware-protocol/line.ts";
import {
  ARMED,
  CURVE,
  caseCounts,
  curveAt,
  EMITTING,
  emittingBoard,
  Host,
  INDICATOR,
  LIMITED,
  SETTLE_ms,
  TERM,
  TRIPPED,
} from "./host.ts";
import { buildSimulator, CYCLES_PER_ms } from "./simulator.ts";
import { World } from "./world.ts";

/** A filter of 2 ms and one plant step, on top of what the pin does. */
const FALL_ms = 20;

beforeAll(() => {
  buildSimulator();
});

describe("a session on the simulated board", () => {
  let world: World | null = null;
  afterEach(() => world?.stop());

  test("arms, holds the emission delay, and follows permits", async () => {
    world = new World();
    const host = new Host(world);
    await world.chip.command("case 25");
    await world.pass(SETTLE_ms);
    const hello = await host.introduce();
    expect(hello).toMatchObject({ firmware: "bs-atmega328p-1", rate: 50, tick_us: 1000 });
    expect(host.heard.filter((m) => m.verb === "channel").map((m) => m.fields.name)).toEqual([
      "set",
      "current",
      "case",
      "photodiode",
      "forward",
      "supply",
      "sink",
    ]);
    expect(await host.ask(">ask arm", "offer")).toMatchObject({ verb: "no" }); // no curve yet
    await host.loadCurve(CURVE);
    await host.arm();
    const armedAt = world.now;
    await world.pass(5);
    expect(world.state.indicator).toBe(true);

    host.wish = { cap: 800, aim: 700, term: TERM };
    await world.until("light", 6000, () => host.last.values[0] === 700);
    const first = world.chip.outputs.find((o) => o.drive > 0)?.cycle ?? 0;
    expect((first - armedAt) / CYCLES_PER_ms).toBeGreaterThanOrEqual(3000);
    expect((first - armedAt) / CYCLES_PER_ms).toBeLessThanOrEqual(5000);

    await world.pass(200);
    expect(host.last.status & (EMITTING | ARMED | INDICATOR)).toBe(EMITTING | ARMED | INDICATOR);
    expect(world.state.current_mA).toBeCloseTo(1400, 0);
    expect((host.last.values[1] ?? 0) * 0.15259).toBeGreaterThan(1390);
    expect((host.last.values[1] ?? 0) * 0.15259).toBeLessThan(1410);
    expect(host.last.ack).toBe(host.permitted?.n);
    expect(host.last.age).toBeLessThan(20); // a line each way, at 115200 baud

    host.wish = { cap: 800, aim: 300, term: TERM };
    await world.pass(200);
    expect(host.last.values[0]).toBe(300);

    host.world.sendLine(seal(">dark 0"));
    const asked = world.now;
    await world.pass(100);
    expect(world.cutAfter_ms(asked)).toBeLessThan(8); // behind a permit on the wire
    expect(host.last.status & (ARMED | EMITTING | TRIPPED)).toBe(0);
    await world.pass(2000); // permits of the ended session go on, and count for nothing
    expect(world.litSince(asked + FALL_ms * CYCLES_PER_ms)).toBe(false);
    expect(host.broken).toEqual([]);

    // Not one sample and not one of its conversions was lost in all that time.
    const [start] = host.samples;
    const ticks = host.last.tick - (start?.tick ?? 0);
    expect(host.last.seq - (start?.seq ?? 0)).toBe(ticks / 20);
    expect(Math.abs(host.last.conv - (start?.conv ?? 0) - ticks)).toBeLessThanOrEqual(1);
  });

  test("a warming case lowers the drive along the curve, then trips and stays dark", async () => {
    const host = await emittingBoard(900);
    world = host.world;
    const from = host.samples.length;
    for (let degC = 25; degC <= 49; degC += 1) {
      await world.chip.command(`case ${degC}`);
      await world.pass(100);
      expect(world.state.drive).toBeLessThanOrEqual(curveAt(caseCounts(degC)) + 1);
    }
    for (const sample of host.samples.slice(from + 3)) {
      expect(sample.values[0]).toBeLessThanOrEqual(900);
    }
    expect(world.state.lit).toBe(true);
    expect(host.last.status & LIMITED).toBe(LIMITED);
    expect(host.last.values[0]).toBeLessThan(600);

    await world.chip.command("case 51");
    const over = world.now;
    await world.pass(400);
    expect(world.darkAfter_ms(over)).toBeGreaterThan(0);
    expect(world.darkAfter_ms(over)).toBeLessThan(300);
    expect(host.last.status & TRIPPED).toBe(TRIPPED);
    expect(host.last.cause).toBe(11);

    await world.chip.command("case 25");
    const tripped = world.now;
    await world.pass(3000); // permits go on; so does an attempt to arm
    await expect(host.arm()).rejects.toThrow("state");
    expect(world.litSince(tripped)).toBe(false);

    expect(await host.ask(">reset 12", "yes")).toMatchObject({ verb: "no" }); // another cause
    expect(await host.ask(">reset 11", "yes")).toMatchObject({ verb: "yes" });
    await world.pass(100);
    expect(host.last.status & TRIPPED).toBe(0);
    await world.pass(1000);
    expect(world.litSince(tripped)).toBe(false); // standby is dark until somebody arms
    await host.arm();
    await world.until("light again", 6000, () => host.last.values[0] === 900);
  });

  test("mains pick-up on the case sensor averages out of a sample", async () => {
    world = new World();
    const host = new Host(world);
    await world.chip.command("case 25");
    const spread = async (hum: string): Promise<number> => {
      await world?.chip.command(hum);
      await world?.pass(100);
      const from = host.samples.length;
      await world?.pass(1000);
      const counts = host.samples.slice(from).map((sample) => sample.values[2] ?? 0);
      expect(counts.length).toBe(50);
      return Math.max(...counts) - Math.min(...counts);
    };
    // 100 mV are 328 counts; 16 counts are one step of the converter.
    expect(await spread("hum 100 50")).toBeLessThanOrEqual(8);
    expect(await spread("hum 100 100")).toBeLessThanOrEqual(8);
    expect(await spread("hum 100 60")).toBeGreaterThan(50); // so the pick-up does reach the reading
  });
});
