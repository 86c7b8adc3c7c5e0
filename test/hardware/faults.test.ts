import { beforeAll, describe, expect, test } from "vitest";
import { seal } from "../../firmware-protocol/line.ts";
import { type Host, onBoard, TERM, TRIPPED } from "./host.ts";
import { buildSimulator, CYCLES_PER_ms } from "./simulator.ts";

/** From a dark pin to less than 5 mA: the 2 ms filter of the board's page, and the plant's step. */
const FALL_ms = 15;
/** Two passes of the main loop, and the rounding of a tick. */
const PASS_ms = 2;
/** The one-shot of the board's page. */
const ONE_SHOT_ms = 75;

beforeAll(() => {
  buildSimulator();
});

/** The board is tripped with `cause`, and a further second of permits and arming change nothing. */
const staysDark = async (host: Host, cause: number): Promise<void> => {
  const { world } = host;
  await world.pass(100);
  expect(host.last.status & TRIPPED).toBe(TRIPPED);
  expect(host.last.cause).toBe(cause);
  const from = world.now;
  host.wish = null;
  await host.introduce();
  host.wish = { cap: 700, aim: 700, term: TERM };
  await expect(host.arm()).rejects.toThrow("state");
  await world.pass(1000);
  expect(world.litSince(from)).toBe(false);
  expect(world.state.drive).toBe(0);
  expect(host.last.cause).toBe(cause);
};

/** Current is gone within `within_ms` of `cycle`. */
const darkWithin = async (host: Host, cycle: number, within_ms: number): Promise<void> => {
  const { world } = host;
  await world.pass(within_ms + 50);
  expect(world.darkAfter_ms(cycle)).toBeGreaterThan(0);
  expect(world.darkAfter_ms(cycle)).toBeLessThanOrEqual(within_ms);
};

/** Current is gone, and was not gone early, when the newest permit's term ends. */
const expires = async (host: Host): Promise<void> => {
  const { world } = host;
  const permit = host.permitted;
  if (permit === null) throw new Error("no permit was sent");
  const end = await world.cycleOfTick(permit.tick + permit.term);
  await world.pass(TERM + 100);
  const late_ms = world.cutAfter_ms(end - 5 * CYCLES_PER_ms) - 5;
  expect(late_ms).toBeGreaterThan(-PASS_ms);
  expect(late_ms).toBeLessThan(PASS_ms);
  await darkWithin(host, end - 5 * CYCLES_PER_ms, 5 + PASS_ms + FALL_ms);
};

describe.concurrent("the host falls silent", () => {
  test("host stops: dark at the end of the term, latched", () =>
    onBoard(async (host) => {
      host.wish = null;
      host.world.onLine = () => {};
      await expires(host);
      host.world.onLine = host.take;
      await staysDark(host, 2);
    }));

  test("permits stop while samples and other lines flow", () =>
    onBoard(async (host) => {
      host.wish = null;
      for (let n = 0; n < 4; n += 1) {
        host.world.sendLine(seal(">status"));
        await host.world.pass(100);
      }
      await expires(host);
      await staysDark(host, 2);
    }));
});

/** Replaces the byte at `at`. */
const spoilt = (line: string, at: number, byte: string): string =>
  line.slice(0, at) + byte + line.slice(at + 1);

/** Ways a wire spoils one genuine permit; none of them may raise current or prolong light. */
const spoilings: readonly ((line: string, earlier: string) => string[])[] = [
  (line) => [spoilt(line, 9, "F")], // in the session
  (line) => [line.replace(/ 700 700 /, " 900 900 ")], // in cap and aim, checksum left
  (line) => [`${line.slice(0, -4)}0000`],
  (line) => [line.slice(0, 20)], // cut
  (line) => [line.slice(20)],
  (line) => [line.slice(0, 20) + line], // the end of one lost, the next whole
  (line) => [`${line} `],
  (line) => [line.toLowerCase()],
  (line) => [`${line}${line}`],
  (line) => ["x".repeat(200) + line],
  (line) => [spoilt(line, 12, String.fromCharCode(0x80))],
  (_line, earlier) => [earlier, earlier], // replayed
];

describe.concurrent("a bad wire", () => {
  test("lines garbled, cut, joined, replayed: never more current, and no longer light", () =>
    onBoard(async (host) => {
      const { world } = host;
      let earlier = "";
      let turn = 0;
      const send = (line: string): void => {
        const spoil = spoilings[turn % spoilings.length];
        turn += 1;
        if (earlier !== "") for (const bad of spoil?.(line, earlier) ?? []) world.sendLine(bad);
      };
      host.post = (line) => {
        send(line);
        world.sendLine(line);
        earlier = line;
      };
      await world.pass(2000);
      expect(Math.max(...world.chip.outputs.map((o) => o.drive))).toBe(700);
      expect(world.state.lit).toBe(true);
      expect(turn).toBeGreaterThan(2 * spoilings.length);

      // Now only spoilt ones: they prolong nothing.
      const lastGood = host.permitted;
      if (lastGood === null) throw new Error("no permit was sent");
      host.post = send;
      const end = await world.cycleOfTick(lastGood.tick + lastGood.term);
      await world.pass(TERM + 100);
      expect(world.cutAfter_ms(end - 5 * CYCLES_PER_ms)).toBeLessThan(5 + PASS_ms);
      expect(Math.max(...world.chip.outputs.map((o) => o.drive))).toBe(700);
      host.post = (line) => world.sendLine(line);
      await staysDark(host, 2);
    }));

  test("permits doubled and reordered: each counts once, the newest stands", () =>
    onBoard(async (host) => {
      const { world } = host;
      const aims = [650, 600, 300];
      let held: string[] = [];
      let sent = host.permitted;
      host.post = (line) => {
        held.push(line);
        host.wish = { cap: 700, aim: aims[held.length % aims.length] ?? 0, term: TERM };
        if (held.length < aims.length) return;
        // The newest first, then the older two with their higher aims, then the newest again.
        const [a, b, c] = held;
        for (const late of [c, b, a, c]) world.sendLine(late ?? "");
        held = [];
        sent = host.permitted;
      };
      host.wish = { cap: 700, aim: aims[0] ?? 0, term: TERM };
      await world.pass(300);
      const from = world.now;
      await world.pass(1000);
      expect(world.state.lit).toBe(true);
      expect(world.chip.outputs.filter((o) => o.cycle > from && o.drive > 300)).toEqual([]);
      const stale = host.heard.filter((m) => m.verb === "no" && m.fields.reason === "stale");
      expect(stale.length).toBeGreaterThan(10);
      host.wish = null;
      host.permitted = sent;
      await expires(host);
      await staysDark(host, 2);
    }));

  test.each([
    ["a bare dark", "dark\n"],
    ["a dark with a wrong checksum", ">dark 0 0000\n"],
    ["three 0x18 inside a line", ">permit 12\x18\x18\x18"],
  ])("%s cuts and latches", (_name, bytes) =>
    onBoard(async (host) => {
      await host.quiet();
      host.world.send(Buffer.from(bytes, "latin1"));
      const sent = host.world.now;
      await host.world.pass(50);
      const wire_ms = (bytes.length * 11 * 1000) / 115_200;
      expect(host.world.cutAfter_ms(sent)).toBeLessThan(wire_ms + PASS_ms);
      await darkWithin(host, sent, wire_ms + PASS_ms + FALL_ms);
      await staysDark(host, 4);
    }),
  );

  test("a serial break cuts and latches", () =>
    onBoard(async (host) => {
      await host.quiet();
      await host.world.chip.command("break");
      const sent = host.world.now;
      await host.world.pass(50);
      expect(host.world.cutAfter_ms(sent)).toBeLessThan(1);
      await darkWithin(host, sent, PASS_ms + FALL_ms);
      await staysDark(host, 4);
    }));
});

describe.concurrent("the board itself fails", () => {
  test.each([
    ["main loop", "core_pass"],
    ["interrupt", "__vector_14"],
  ])("%s hangs: the one-shot ends the light, the watchdog the hang", (_name, symbol) =>
    onBoard(async (host) => {
      const { world } = host;
      await world.chip.command(`hang ${symbol}`);
      const from = world.now;
      await darkWithin(host, from, ONE_SHOT_ms + 5);
      await world.pass(600);
      const bitten = world.chip.boots.find((cycle) => cycle > from) ?? 0;
      const watchdog_ms = (bitten - from) / CYCLES_PER_ms;
      expect(watchdog_ms).toBeGreaterThan(400);
      expect(watchdog_ms).toBeLessThan(650);
      await world.pass(1200); // it hangs again after every reset
      expect(world.chip.boots.length).toBeGreaterThan(3);
      await world.chip.command("mend");
      await world.pass(700);
      expect(world.litSince(from + 100 * CYCLES_PER_ms)).toBe(false);
      await staysDark(host, 6);
    }),
  );

  test.each([
    ["brown-out", 7],
    ["power", 5],
    ["external", 5],
  ])("reset by %s: dark at once, latched as cause %i", (kind, cause) =>
    onBoard(async (host) => {
      await host.world.chip.command(`reset ${kind}`);
      await darkWithin(host, host.world.now, FALL_ms);
      await host.world.pass(200);
      await staysDark(host, cause);
    }),
  );

  test.each([
    ["key", 16],
    ["loop", 17],
  ])("%s opens: cut within 10 ms, and closing it again lights nothing", (pin, cause) =>
    onBoard(async (host) => {
      await host.world.chip.command(`pin ${pin} 0`);
      const opened = host.world.now;
      await host.world.pass(50);
      expect(host.world.cutAfter_ms(opened)).toBeLessThan(10);
      await darkWithin(host, opened, 10 + FALL_ms);
      await host.world.chip.command(`pin ${pin} 1`);
      await host.world.pass(600);
      await staysDark(host, cause);
    }),
  );
});

describe.concurrent("a sensor fails", () => {
  test.each([
    ["case sensor open", "adc 1 4951", 12, 120],
    ["case sensor shorted", "adc 1 0", 13, 120],
    ["measured current above the ceiling", "adc 0 4200", 8, 30],
    ["case over its limit", "case 52", 11, 300],
  ])("%s", (_name, command, cause, within_ms) =>
    onBoard(async (host) => {
      await host.world.chip.command(command);
      const from = host.world.now;
      await host.world.pass(within_ms + 50);
      expect(host.world.cutAfter_ms(from)).toBeGreaterThan(0);
      expect(host.world.cutAfter_ms(from)).toBeLessThan(within_ms);
      await host.world.chip.command("adc 0 free");
      await host.world.chip.command("adc 1 free");
      await host.world.chip.command("case 25");
      await staysDark(host, cause);
    }),
  );
});
