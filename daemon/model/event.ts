import type { Mono_ms, Wall_ms } from "./times.ts";

/** What an event is. Words for people are made from kind, hazard and data by `words.ts` of judge/. */
export const EVENT_KINDS = [
  "connected",
  "disconnected",
  "armed",
  "emitting",
  "dark",
  "trip",
  "reset",
  "warning",
  "warning-over",
  "capped",
  "uncapped",
  "set",
  "refused",
  "link",
  "adopted",
  "record",
  "desk",
  "light-seen",
  "light-gone",
  "unenforced",
  "epoch",
  "reading",
] as const;
export type EventKind = (typeof EVENT_KINDS)[number];

/** One thing that happened. Ids are unique in a data folder and ascend in time. */
export interface BenchEvent {
  readonly id: number;
  readonly bench: string;
  /** Number of the judge's input that made it; 0 for events from elsewhere. */
  readonly input: number;
  /** Controller tick, or −1 where no controller was connected. */
  readonly tick: number;
  readonly mono: Mono_ms;
  readonly wall: Wall_ms;
  readonly kind: EventKind;
  /** Row of the hazard table or id of the cause; empty where neither applies. */
  readonly hazard: string;
  /** Numbers and words of this event, units in the names. */
  readonly data: Readonly<Record<string, number | string>>;
}
