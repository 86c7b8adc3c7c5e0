import { describe, expect, test } from "vitest";
import {
  PAUSE_ms_MAX,
  PAUSE_ms_MIN,
  Reconnect,
  TRIES_MAX,
} from "../../../daemon/link/transports/reconnect.ts";
import type { Transport, TransportHandlers } from "../../../daemon/link/transports/transport.ts";

/** A transport that does what the test says. */
class Fake implements Transport {
  readonly name = "the fake port";
  drained = true;
  readonly written: string[] = [];
  closed = false;
  handlers: TransportHandlers = { opened() {}, line() {}, closed() {} };

  open(handlers: TransportHandlers): void {
    this.handlers = handlers;
  }

  write(line: string): boolean {
    this.written.push(line);
    return true;
  }

  close(): void {
    this.closed = true;
  }
}

/** Reconnecting on a timer that the test turns. */
const bench = () => {
  const made: Fake[] = [];
  const told: string[] = [];
  const pauses: number[] = [];
  let due: (() => void) | null = null;
  const link = new Reconnect(
    () => {
      const fake = new Fake();
      made.push(fake);
      return fake;
    },
    {
      opened: () => told.push("opened"),
      line: (line) => told.push(line),
      closed: (why) => told.push(`closed: ${why}`),
    },
    (ms, run) => {
      pauses.push(ms);
      due = run;
      return () => {
        due = null;
      };
    },
  );
  const newest = (): Fake => made[made.length - 1] ?? new Fake();
  return {
    link,
    made,
    told,
    pauses,
    newest,
    turn: (): boolean => {
      const run = due;
      due = null;
      run?.();
      return run !== null;
    },
  };
};

describe("reconnecting", () => {
  test("nothing happens before the maker has the object in hand", () => {
    const b = bench();
    expect(b.made).toHaveLength(0);
    expect(b.link.write("x\n")).toBe(false);
    b.turn();
    expect(b.made).toHaveLength(1);
  });

  test("a fresh transport for each connection, and lines written between two are dropped", () => {
    const b = bench();
    b.turn();
    b.newest().handlers.opened();
    expect(b.link.write("first\n")).toBe(true);
    b.newest().handlers.closed("unplugged");
    expect(b.link.write("late\n")).toBe(false);
    b.turn();
    expect(b.link.write("later\n")).toBe(false);
    b.newest().handlers.opened();
    expect(b.made.map((f) => f.written)).toEqual([["first\n"], []]);
    expect(b.told).toEqual(["opened", "closed: unplugged", "opened"]);
  });

  test("pauses double up to the longest; only a received line shortens them", () => {
    const b = bench();
    b.turn();
    for (let i = 0; i < 8; i += 1) {
      b.newest().handlers.opened();
      b.newest().handlers.closed("silent");
      b.turn();
    }
    expect(b.pauses.slice(1, 5)).toEqual([PAUSE_ms_MIN, 500, 1000, 2000]);
    expect(Math.max(...b.pauses)).toBe(PAUSE_ms_MAX);
    b.newest().handlers.opened();
    expect(b.link.status.tries).toBe(9);
    b.newest().handlers.line("<say hello");
    expect(b.link.status.tries).toBe(0);
    b.newest().handlers.closed("unplugged");
    expect(b.pauses.at(-1)).toBe(PAUSE_ms_MIN);
  });

  test("it ends after a count, and says so", () => {
    const b = bench();
    while (b.turn()) b.newest().handlers.closed("no such port.");
    expect(b.made).toHaveLength(TRIES_MAX);
    expect(b.link.status.state).toBe("ended");
    expect(b.link.words()).toMatch(/Given up after 8640 tries/);
  });

  test("a port that never opened is told in words, not as a closed connection", () => {
    const b = bench();
    b.turn();
    b.newest().handlers.closed("/dev/none does not exist.");
    expect(b.told).toEqual([]);
    expect(b.link.words()).toBe("/dev/none does not exist. Try 2 follows in 0.3 s.");
  });

  test("a connection that is over tells nothing more", () => {
    const b = bench();
    b.turn();
    const old = b.newest();
    old.handlers.opened();
    old.handlers.closed("unplugged");
    b.turn();
    old.handlers.line("<say from the past");
    old.handlers.closed("again");
    expect(b.told).toEqual(["opened", "closed: unplugged"]);
  });

  test("close ends it for good, closes the port and calls nobody", () => {
    const b = bench();
    b.turn();
    b.newest().handlers.opened();
    b.link.close();
    expect(b.newest().closed).toBe(true);
    expect(b.turn()).toBe(false);
    expect(b.link.write("x\n")).toBe(false);
    expect(b.told).toEqual(["opened"]);
  });
});
