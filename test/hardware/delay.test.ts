import { beforeAll, describe, expect, test } from "vitest";
import { EMITTING, type Host, onBoard, TERM, TRIPPED } from "./host.ts";
import { buildSimulator, CYCLES_PER_ms } from "./simulator.ts";

/** Two passes of the main loop and the rounding of a tick; then the 2 ms filter down to 5 mA. */
const PASS_ms = 2;
const FALL_ms = 15;

beforeAll(() => {
  buildSimulator();
});

/** A permit that reached the board, in cycles: when it left its buffer, and the end of its term. */
interface Granted {
  readonly arrives: number;
  readonly end: number;
}

/** Lets the host go on for `ms`, noting the permit in force and every one that follows it. */
const noted = async (host: Host, ms: number, stick: () => void): Promise<Granted[]> => {
  const { world } = host;
  const granted: Granted[] = [];
  const zero = await world.cycleOfTick(0);
  const note = (arrives: number): void => {
    const permit = host.permitted;
    if (permit === null) throw new Error("no permit was sent");
    granted.push({ arrives, end: zero + (permit.tick + permit.term) * CYCLES_PER_ms });
  };
  note(world.now);
  host.post = (line) => {
    note(world.down.exit(world.now));
    world.sendLine(line);
  };
  stick();
  await world.pass(ms);
  return granted;
};

/** At no millisecond since `from` does current flow behind the end of the newest term received. */
const neverOutlasts = (host: Host, granted: readonly Granted[], from: number): void => {
  const { world } = host;
  const slack = (PASS_ms + FALL_ms) * CYCLES_PER_ms;
  for (let at = from; at < world.now; at += CYCLES_PER_ms) {
    const lit = world.chip.outputs.findLast((output) => output.cycle <= at)?.lit ?? false;
    const end = granted.findLast((permit) => permit.arrives <= at)?.end ?? 0;
    if (lit) expect(at).toBeLessThanOrEqual(end + slack);
  }
};

describe.concurrent.each([
  ["samples to the host", "up"],
  ["permits to the board", "down"],
] as const)("a buffer that holds %s", (_what, direction) => {
  test("for 200 ms: light stays, on permits that are late and no longer", () =>
    onBoard(async (host) => {
      const { world } = host;
      const from = world.now;
      const granted = await noted(host, 1000, () => {
        world[direction].stuckUntil = world.now + 200 * CYCLES_PER_ms;
      });
      neverOutlasts(host, granted, from);
      expect(host.last.status & EMITTING).toBe(EMITTING);
      const ages = host.samples.slice(-50).map((sample) => sample.age);
      expect(Math.max(...ages)).toBeGreaterThan(20); // 10 to 13 on a free wire
      expect(Math.max(...ages)).toBeLessThan(TERM);
    }));

  test("for 300 ms, then silence: the term has counted from the judged sample, not from receipt", () =>
    onBoard(async (host) => {
      const { world } = host;
      await host.quiet();
      let posted = false;
      world[direction].stuckUntil = world.now + 300 * CYCLES_PER_ms;
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
      expect(Math.abs(world.cutAfter_ms(end - 10 * CYCLES_PER_ms) - 10)).toBeLessThan(PASS_ms);
      expect(host.last.cause).toBe(2);
    }));

  test("for 2 s: dark at the end of the last term, and what comes late lights nothing", () =>
    onBoard(async (host) => {
      const { world } = host;
      await host.quiet();
      const from = world.now;
      const granted = await noted(host, 2000, () => {
        world[direction].stuckUntil = world.now + 2000 * CYCLES_PER_ms;
      });
      neverOutlasts(host, granted, from);
      expect(world.darkAfter_ms(from)).toBeGreaterThan(TERM / 2);
      expect(world.darkAfter_ms(from)).toBeLessThan(TERM + FALL_ms);
      const dark = world.now;
      await world.pass(1000);
      expect(world.litSince(dark)).toBe(false);
      expect(host.last.status & TRIPPED).toBe(TRIPPED);
      expect(host.last.cause).toBe(2);
    }));
});
