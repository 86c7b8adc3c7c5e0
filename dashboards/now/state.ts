import { computed, signal } from "@preact/signals";
import type { EventLine, Snapshot } from "../../daemon/desk/api.ts";
import { age } from "../words/format.ts";
import { Track } from "./track.ts";

/** What the page knows. Filled by the stream, read by the parts; nothing else is shared. */

export const track = new Track();

/** The newest snapshot as it is drawn; at most four a second, so that digits can be read. */
export const snapshot = signal<Snapshot | undefined>(undefined);
export const events = signal<readonly EventLine[]>([]);

/** When the last snapshot came, by this page's own clock, ms; undefined before the first. */
export const heard_ms = signal<number | undefined>(undefined);
/** This page's own clock, half a second coarse. */
export const clock_ms = signal(performance.now());
/** Whether the desk says that it has its line to the judging thread. */
export const lineUp = signal(true);
export const signedOut = signal(false);

/** Minutes of past in sight; undefined follows the age of the record. */
export const chosenSpan_min = signal<number | undefined>(undefined);
/** Moment under the cursor, ms since 1970; undefined while nobody reads back. */
export const cursor_at = signal<number | undefined>(undefined);

/** Without news for this long, numbers are not of now. */
export const STALE_ms = 2000;

/** How long ago this page last heard of the bench, ms; 0 while it hears. */
export const silence_ms = computed<number>(() => {
  const s = snapshot.value;
  if (s === undefined || heard_ms.value === undefined) return 0;
  const unheard = clock_ms.value - heard_ms.value;
  const boardSilent = s.state === "offline" ? 0 : (s.age_ms ?? 0);
  return Math.max(unheard > STALE_ms ? unheard : 0, boardSilent > STALE_ms ? boardSilent : 0);
});

/** Written over the hatched numbers; empty while they are of now. */
export const staleWords = computed<string>(() => {
  if (snapshot.value?.state === "offline") return "no board";
  if (silence_ms.value > 0) return `${age(silence_ms.value)} old`;
  return lineUp.value ? "" : "no line";
});

/** Events that a page keeps: more than fit under any picture. */
const EVENTS_MAX = 500;

/** Adds events by their number, in order, each once. */
export function addEvents(more: readonly EventLine[]): void {
  const byId = new Map(events.value.map((e) => [e.id, e]));
  for (const e of more) byId.set(e.id, e);
  events.value = [...byId.values()].sort((a, b) => a.at - b.at || a.id - b.id).slice(-EVENTS_MAX);
}
