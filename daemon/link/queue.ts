import type { LinkFact } from "../model/link-fact.ts";
import type { Sample } from "../model/sample.ts";
import type { Mono_ms } from "../model/times.ts";
import type { LinkCounts } from "./counts.ts";
import type { RawLog } from "./rawlog.ts";

/** What came of a call, in order: lines to send first, then samples and facts as they happened. */
export type LinkItem =
  | { readonly kind: "send"; readonly line: string; readonly urgent: boolean }
  | { readonly kind: "sample"; readonly sample: Sample; readonly receivedAt: Mono_ms }
  | {
      readonly kind: "fact";
      readonly fact: LinkFact;
      readonly value: number;
      readonly text: string;
    };

/** What a queued line may lead to: `light` lines are purged by a dark, `dark` goes before all. */
export type LineClass = "dark" | "light" | "plain";

interface Slot {
  fact: LinkFact | null;
  value: number;
  text: string;
}

type Mutable<T> = { -readonly [K in keyof T]: T[K] };

/**
 * Lines waiting to be sent and happenings waiting to be told. Items are reused: an item is valid
 * until the next `take`. Nothing is accepted for a closed port, so nothing can be sent late.
 */
export class LinkQueue {
  private readonly lines: string[] = [];
  private readonly classes: LineClass[] = [];
  private readonly slots: Slot[] = [];
  private first = 0;
  private count = 0;
  private open = false;
  /** A sample was filled in and not taken yet. */
  private waiting = false;
  private now = 0;
  private readonly counts: LinkCounts;
  private readonly log: RawLog;
  private readonly sampleItem: Mutable<Extract<LinkItem, { kind: "sample" }>>;
  private readonly factItem: Mutable<Extract<LinkItem, { kind: "fact" }>> = {
    kind: "fact",
    fact: "port-open",
    value: 0,
    text: "",
  };

  constructor(sample: Sample, counts: LinkCounts, log: RawLog) {
    this.counts = counts;
    this.log = log;
    this.sampleItem = { kind: "sample", sample, receivedAt: 0 as Mono_ms };
  }

  /** Tells the queue what time it is, for the raw log. */
  at(now: Mono_ms): void {
    this.now = now;
  }

  /** Opens or closes the port's side. Both forget every line that was not sent. */
  setOpen(open: boolean): void {
    this.open = open;
    this.lines.length = 0;
    this.classes.length = 0;
  }

  /** Queues one line, without its end. A dark goes to the front. */
  send(line: string, lineClass: LineClass): void {
    if (!this.open) return;
    if (lineClass === "dark") {
      this.lines.unshift(line);
      this.classes.unshift(lineClass);
    } else {
      this.lines.push(line);
      this.classes.push(lineClass);
    }
  }

  /** Drops every queued line of one class: light before a dark, an older dark before a new one. */
  purge(lineClass: LineClass): void {
    for (let i = this.lines.length - 1; i >= 0; i -= 1) {
      if (this.classes[i] !== lineClass) continue;
      this.lines.splice(i, 1);
      this.classes.splice(i, 1);
    }
  }

  fact(fact: LinkFact, value: number, text: string): void {
    const slot = this.push();
    slot.fact = fact;
    slot.value = value;
    slot.text = text;
  }

  /**
   * The record given to the constructor was filled and waits to be judged. There is one record, so
   * a second sample before the first was taken is a defect of the caller, who must stop.
   */
  sample(receivedAt: Mono_ms): void {
    if (this.waiting) throw new Error("a sample was fed before the last one was taken");
    this.waiting = true;
    const slot = this.push();
    slot.fact = null;
    slot.value = receivedAt;
    slot.text = "";
  }

  /** The next line to send, with its end, or null. */
  takeLine(): { readonly line: string; readonly urgent: boolean } | null {
    const line = this.lines.shift();
    if (line === undefined) return null;
    const urgent = this.classes.shift() === "dark";
    this.counts.sent += 1;
    this.log.sent(line, this.now);
    return { line: `${line}\n`, urgent };
  }

  /** The next item, lines before happenings, or null. */
  take(): LinkItem | null {
    if (this.lines.length > 0) {
      const next = this.takeLine();
      if (next !== null) return { kind: "send", line: next.line, urgent: next.urgent };
    }
    if (this.count === 0) return null;
    const slot = this.slots[this.first];
    this.first += 1;
    this.count -= 1;
    if (this.count === 0) this.first = 0;
    if (slot === undefined) return null;
    if (slot.fact === null) {
      this.waiting = false;
      this.sampleItem.receivedAt = slot.value as Mono_ms;
      return this.sampleItem;
    }
    this.factItem.fact = slot.fact;
    this.factItem.value = slot.value;
    this.factItem.text = slot.text;
    return this.factItem;
  }

  /** A slot at the end. Slots are kept, so that the queue grows to what one call brings at most. */
  private push(): Slot {
    const place = this.first + this.count;
    this.count += 1;
    const known = this.slots[place];
    if (known !== undefined) return known;
    const made: Slot = { fact: null, value: 0, text: "" };
    this.slots.push(made);
    return made;
  }
}
