import { EventEmitter } from "node:events";
import { afterEach, beforeEach, expect, test } from "vitest";
import type { WebSocket } from "ws";
import { Live, PAGES_MAX } from "../../../daemon/desk/live.ts";
import { snapshotOf } from "../../browser/story.ts";

/** What a page would hear; stands for the socket of `ws`. */
class Heard extends EventEmitter {
  readonly got: { push: string; connected?: boolean }[] = [];
  bufferedAmount = 0;
  closed = 0;
  send(text: string): void {
    this.got.push(JSON.parse(text));
  }
  close(code: number): void {
    this.closed = code;
  }
  terminate(): void {
    this.emit("close");
  }
  ping(): void {}
}

let now = 0;
let live: Live;
beforeEach(() => {
  now = 0;
  live = new Live(() => now);
  live.line(true);
});
afterEach(() => live.close());

function page(): Heard {
  const heard = new Heard();
  live.add(heard as unknown as WebSocket);
  heard.got.length = 0;
  return heard;
}

const take = (kind: "calm" | "tripped", at: number): void =>
  live.take({ push: "snapshot", snapshot: snapshotOf(kind, at) });

test("a page gets at most ten snapshots a second, and a change of state at once", () => {
  const heard = page();
  for (now = 0; now < 1000; now += 20) take("calm", now);
  expect(heard.got.length).toBeLessThanOrEqual(10);
  expect(heard.got.length).toBeGreaterThanOrEqual(8);
  now = 1001;
  take("calm", now);
  const before = heard.got.length;
  now = 1003;
  take("tripped", now);
  expect(heard.got.length).toBe(before + 1);
});

test("a page that does not read gets no snapshots, but its events", () => {
  const heard = page();
  heard.bufferedAmount = 1e6;
  take("calm", 0);
  live.take({
    push: "event",
    event: { id: 1, at: 0, kind: "armed", hazard: "", weight: "calm", words: "Armed." },
  });
  expect(heard.got.map((m) => m.push)).toEqual(["event"]);
});

test("when the line is lost pages hear it, and the old snapshot is told to nobody", () => {
  const heard = page();
  take("calm", 0);
  live.line(false);
  expect(heard.got.at(-1)).toEqual({ push: "line", connected: false });
  expect(live.snapshot).toBeUndefined();
  expect(live.bench).toBe("north");
  const late = new Heard();
  live.add(late as unknown as WebSocket);
  expect(late.got).toEqual([{ push: "line", connected: false }]);
});

test(`there are at most ${PAGES_MAX} pages`, () => {
  for (let i = 0; i < PAGES_MAX; i++) page();
  const last = page();
  expect(last.closed).toBe(1013);
  expect(live.pages).toBe(PAGES_MAX);
});
