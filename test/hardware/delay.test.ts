import { afterEach, beforeAll, describe, expect, test } from "vitest";
import { EMITTING, emittingBoard, type Host, TERM, TRIPPED } from "./host.ts";
import { buildSimulator, CYCLES_PER_MS } from "./simulator.ts";

/** Two passes of the main loop and the rounding of a tick; then the 2 ms filter down to 5 mA. */
const PASS_MS = 2;
const FALL_MS = 15;

let host: Host;

beforeAll(() => {
  buildSimulator();
});
afterEach(() => host.world.stop());

/** Every permit that reached the board: cycle of the judged sample, and end of its term. */
interface Granted {
  readonly sample: number;
  readonly end: number;
}

/** Lets the host go on for `ms`, noting every permit on the wire with its sample's own moment. */
const noted = async (ms: number, stick: () => void): Promise<Granted[]> => {
  const { world } = host;
  const granted: Granted[] = [];
  const zero = await world.cycleOfTick(0);
  host.post = (line) => {
    world.sendLine(line);
    const permit = host.permitted;
    if (permit === null) return;
    const sample = zero + permit.tick * CYCLES_PER_MS;
    granted.push({ sample, end: sample + permit.term * CYCLES_PER_MS });
  };
  stick();
  await world.pass(ms);
  return granted;
};

/** Current never flows later than the end of the newest term that had begun by then. */
const neverOutlasts = (granted: readonly Granted[], from: number): void => {
  const { world } = host;
  const slack = (PASS_MS + FALL_MS) * CYCLES_PER_MS;
  const { outputs } = world.chip;
  outputs.forEach((output, i) => {
    if (!output.lit || output.cycle < from) return;
    const litUntil = outputs[i + 1]?.cycle ?? world.now;
    const newest = Math.max(...granted.filter((g) => g.sample <= litUntil).map((g) => g.end));
    expect(litUntil).toBeLessThanOrEqual(newest + slack);
  });
};

describe.each([
  ["samples to the host", "up"],
  ["permits to the board", "down"],
] as const)("a buffer that holds %s", (_what, direction) => {
  test("for 200 ms: light stays, on permits that are late and no longer", async () => {
    host = await emittingBoard();
    const { world } = host;
    const from = world.now;
    const granted = await noted(1000, () => {
      world[direction].stuckUntil = world.now + 200 * CYCLES_PER_MS;
    });
    neverOutlasts(granted, from);
    expect(host.last.status & EMITTING).toBe(EMITTING);
    const ages = host.samples.slice(-50).map((sample) => sample.age);
    expect(Math.max(...ages)).toBeGreaterThan(20); // 10 to 13 on a free wire
    expect(Math.max(...ages)).toBeLessThan(TERM);
  });

  test("for 300 ms, then silence: the term has counted from the judged sample, not from receipt", async () => {
    host = await emittingBoard();
    const { world } = host;
    await host.quiet();
    let posted = false;
    world[direction].stuckUntil = world.now + 300 * CYCLES_PER_MS;
    // One permit for the first sample from now on; it or its sample waits in the buffer.
    host.post = (line) => {
      world.sendLine(line);
      host.wish = null;
      posted = true;
    };
    await world.until("the permit's acknowledgement", 400, () => {
      return posted && host.last.ack === host.permitted?.n;
    });
    expect(host.last.age).toBeGreaterThan(250);
    const { tick, term } = host.permitted ?? { tick: 0, term: 0 };
    const end = await world.cycleOfTick(tick + term);
    await world.pass(TERM + 100);
    expect(Math.abs(world.cutAfter_ms(end - 10 * CYCLES_PER_MS) - 10)).toBeLessThan(PASS_MS);
    expect(host.last.cause).toBe(2);
  });

  test("for 2 s: dark at the end of the last term, and what comes late lights nothing", async () => {
    host = await emittingBoard();
    const { world } = host;
    const before = host.permitted;
    if (before === null) throw new Error("no permit was sent");
    await host.quiet();
    const from = world.now;
    const end = await world.cycleOfTick(before.tick + before.term);
    await noted(2000, () => {
      world[direction].stuckUntil = world.now + 2000 * CYCLES_PER_MS;
    });
    const dark_ms = world.darkAfter_ms(from);
    expect(dark_ms).toBeGreaterThan(0);
    expect(from + dark_ms * CYCLES_PER_MS).toBeLessThanOrEqual(
      end + (60 + PASS_MS + FALL_MS) * CYCLES_PER_MS, // one permit may still have been on its way
    );
    const dark = world.now;
    await world.pass(1000);
    expect(world.litSince(dark)).toBe(false);
    expect(host.last.status & TRIPPED).toBe(TRIPPED);
    expect(host.last.cause).toBe(2);
  });
});
