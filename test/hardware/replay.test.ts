import { afterEach, beforeAll, describe, expect, test } from "vitest";
import { seal } from "../../firmware-protocol/line.ts";
import { CURVE, EMITTING, emittingBoard, Host, SETTLE_ms, TERM } from "./host.ts";
import { buildSimulator, CYCLES_PER_ms } from "./simulator.ts";
import { type Recorded, World } from "./world.ts";

let world: World;

beforeAll(() => {
  buildSimulator();
});
afterEach(() => world.stop());

/** Puts every recorded byte on the wire again, with the gaps it had, and lets a second pass. */
const replay = async (recorded: readonly Recorded[]): Promise<void> => {
  const shift = world.now - (recorded[0]?.cycle ?? 0);
  for (const { cycle, bytes } of recorded) {
    world.at(cycle + shift, () => world.chip.receive(bytes));
  }
  const last = recorded.at(-1)?.cycle ?? 0;
  await world.pass((last + shift - world.now) / CYCLES_PER_ms + 1000);
};

/** A board that has just been switched on, settled, its case at 25 °C. */
const freshBoard = async (): Promise<World> => {
  const fresh = new World();
  await fresh.chip.command("case 25");
  await fresh.pass(SETTLE_ms);
  return fresh;
};

/** Records a session, from introduction to a person's dark: everything that the host sent. */
const recordSession = async (): Promise<{ host: Host; recorded: Recorded[] }> => {
  const host = await emittingBoard();
  const { world } = host;
  await world.pass(500);
  world.sendLine(seal(">dark 0"));
  host.wish = null;
  await world.pass(100);
  expect(world.state.lit).toBe(false);
  const recorded = world.recorded.slice();
  expect(recorded.length).toBeGreaterThan(60);
  return { host, recorded };
};

describe("a recorded session, byte for byte", () => {
  test("lights nothing on the same board: standing by, reset, and with its tick about to wrap", async () => {
    const { host, recorded } = await recordSession();
    world = host.world;
    const recordedSession = host.session;
    let from = world.now;
    await replay(recorded);
    expect(world.litSince(from)).toBe(false);

    await world.chip.command("reset power");
    from = world.now;
    await world.pass(SETTLE_ms);
    await replay(recorded);
    expect(world.litSince(from)).toBe(false);

    await world.chip.command("reset power");
    await world.pass(SETTLE_ms);
    // The wrap falls into the middle of the replayed permits.
    const middle = recorded[Math.floor(recorded.length / 2)]?.cycle ?? 0;
    const ahead_ms = Math.floor((middle - (recorded[0]?.cycle ?? 0)) / CYCLES_PER_ms);
    await world.chip.poke32("tick", 2 ** 32 - ahead_ms);
    from = world.now;
    await replay(recorded);
    expect(await world.chip.peek32("tick")).toBeLessThan(10_000);
    expect(world.litSince(from)).toBe(false);

    // A host that answers this board lights it: it was not the board that had died.
    await world.chip.command("reset power");
    await world.pass(SETTLE_ms);
    await host.introduce();
    await host.loadCurve(CURVE);
    await host.arm();
    expect(host.session).not.toBe(recordedSession);
    host.wish = { cap: 300, aim: 300, term: TERM };
    await world.until("light", 6000, () => host.last.values[0] === 300);
  });

  test("lights nothing on another board with a fresh memory, three milliseconds later", async () => {
    const { host, recorded } = await recordSession();
    host.world.stop();
    world = await freshBoard();
    await world.pass(3);
    const from = world.now;
    await replay(recorded);
    expect(world.litSince(from)).toBe(false);

    // A simulated chip has no noise of its own, so its twin in the very same cycle makes the same
    // one-time number: the only way to show that a replay that armed would be seen.
    world.stop();
    world = await freshBoard();
    const twin = world.now;
    await replay(recorded);
    expect(world.litSince(twin)).toBe(true);
  });
});

describe("the tick wraps in a running session", () => {
  /** A board that emits, its tick `left` before the wrap. */
  const beforeWrap = async (left_ms: number): Promise<Host> => {
    world = await freshBoard();
    const host = new Host(world);
    await world.chip.poke32("tick", 2 ** 32 - 7000);
    await host.introduce();
    await host.loadCurve(CURVE);
    await host.arm();
    host.wish = { cap: 400, aim: 400, term: TERM };
    await world.until("the time before the wrap", 8000, () => (host.last.tick | 0) >= -left_ms);
    expect(host.last.status & EMITTING).toBe(EMITTING);
    return host;
  };

  test("permits go on counting", async () => {
    const host = await beforeWrap(200);
    await world.pass(700);
    expect(host.last.tick).toBeLessThan(1000);
    expect(host.last.status & EMITTING).toBe(EMITTING);
    expect(host.last.ack).toBeGreaterThan(0);
  });

  test("a term that spans the wrap ends on time", async () => {
    const host = await beforeWrap(250);
    host.wish = null;
    const permit = host.permitted;
    if (permit === null) throw new Error("no permit was sent");
    const end = await world.cycleOfTick(permit.tick + permit.term);
    await world.pass(700);
    expect(Math.abs(world.cutAfter_ms(end - 10 * CYCLES_PER_ms) - 10)).toBeLessThan(2);
    expect(host.last.cause).toBe(2);
  });
});
