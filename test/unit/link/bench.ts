import { type LinkOptions, LinkSession } from "../../../daemon/link/session.ts";
import type { LinkFact } from "../../../daemon/model/link-fact.ts";
import { type Mono_ms, mono } from "../../../daemon/model/times.ts";
import { FakeBoard } from "./fake-board.ts";

export const CURVE = { x: [210, 330, 420, 505], y: [2100, 2100, 1900, 0] };

interface Told {
  readonly fact: LinkFact;
  readonly value: number;
  readonly text: string;
}

/** A session and a fake board on a simulated clock. Lines arrive at once unless a test holds them. */
export class LinkBench {
  readonly board = new FakeBoard();
  readonly session: LinkSession;
  readonly facts: Told[] = [];
  readonly sent: string[] = [];
  samples = 0;
  now: Mono_ms = mono(1000);
  /** Whether the board hears the session, and the session the board. */
  up = true;
  down = true;

  constructor(options: Partial<LinkOptions> = {}) {
    this.session = new LinkSession({ serial: null, curve: () => CURVE, ...options });
  }

  connect(): void {
    this.session.connected(this.now);
    this.settle();
  }

  /** Hands lines back and forth until neither side has any. */
  settle(): void {
    for (let round = 0; round < 100; round += 1) {
      this.drain();
      const lines = this.board.take();
      if (lines.length === 0) return;
      for (const line of this.down ? lines : []) {
        this.session.feed(line, this.now);
        this.drain();
      }
    }
    throw new Error("session and board never stop talking");
  }

  feed(line: string): void {
    this.session.feed(line, this.now);
    this.drain();
  }

  drain(): void {
    for (let item = this.session.take(); item !== null; item = this.session.take()) {
      if (item.kind === "fact") {
        this.facts.push({ fact: item.fact, value: item.value, text: item.text });
      } else if (item.kind === "sample") this.samples += 1;
      else {
        this.sent.push(item.line);
        if (this.up) this.board.receive(item.line.slice(0, -1));
      }
    }
  }

  /** Lets time pass to the session's own deadlines, without samples. */
  pass(ms: number): void {
    const end = this.now + ms;
    for (let n = 0; n < 10_000; n += 1) {
      const next = Math.max(this.now, Math.min(end, this.session.nextDeadline()));
      this.now = mono(next);
      this.session.elapse(this.now);
      this.settle();
      if (next >= end) return;
    }
    throw new Error("deadlines never move on");
  }

  /** Time with a sample every 20 ms. */
  run(ms: number): void {
    const end = this.now + ms;
    while (this.now < end) {
      this.pass(20);
      this.board.sample();
      this.settle();
    }
  }

  /** Connected, introduced, curve loaded. */
  ready(): this {
    this.connect();
    this.run(100);
    return this;
  }

  armed(): this {
    this.ready();
    this.session.arm();
    this.settle();
    this.run(20);
    return this;
  }

  told(fact: LinkFact): Told[] {
    return this.facts.filter((f) => f.fact === fact);
  }

  names(): LinkFact[] {
    return this.facts.map((f) => f.fact);
  }

  /** Bodies sent so far, checksums cut. */
  bodies(verb: string): string[] {
    return this.sent
      .map((l) => l.slice(1, -6))
      .filter((b) => b === verb || b.startsWith(`${verb} `));
  }
}
