import type { Snapshot } from "../../daemon/desk/api.ts";
import { age, clock, clockWithSeconds, keepUnits } from "./format.ts";

/** One sentence that wants somebody, with at most one verb. */
export interface Need {
  readonly key: string;
  readonly weight: "calm" | "warn" | "trip";
  readonly words: string;
  /** The one thing that can be done about it from here. */
  readonly verb?: { readonly text: string; readonly cause: string };
}

/** Samples waiting to be written for longer than this are worth a word, ms. */
const BEHIND_ms = 5000;

const ended = (text: string): string => (/[.!?]$/.test(text) ? text : `${text}.`);
const capital = (text: string): string => text.charAt(0).toUpperCase() + text.slice(1);

/** What wants somebody, worst first: the trip, what this page cannot see, then standing warnings. */
export function needsOf(now: Snapshot, silence_ms: number): Need[] {
  const out: Need[] = [];
  if (now.state === "tripped" && now.cause !== null) {
    out.push({
      key: "trip",
      weight: "trip",
      words: `${capital(now.cause.words)}, first cause, at ${clockWithSeconds(now.since)}.`,
      verb: { text: resetWords(now.cause), cause: now.cause.id },
    });
  }
  if (silence_ms > 0) {
    out.push({
      key: "silent",
      weight: "warn",
      words: `This page hears nothing, for ${age(silence_ms)} now. The board and the judge need no page; only what you see is old.`,
    });
  }
  const oldest = [...now.warnings].sort((a, b) => a.since - b.since);
  for (const { hazard, words, since } of oldest) {
    out.push({
      key: `warning ${hazard} ${since}`,
      weight: "warn",
      words: `${ended(capital(words))} Since ${clock(since)}.`,
    });
  }
  if (now.link.words !== "") {
    out.push({ key: "link", weight: "warn", words: ended(capital(now.link.words)) });
  }
  if (now.recorder.behind_ms > BEHIND_ms || now.recorder.words !== "") {
    const behind = `The record is ${age(now.recorder.behind_ms)} behind.`;
    const words = now.recorder.words === "" ? behind : ended(capital(now.recorder.words));
    out.push({ key: "recorder", weight: "warn", words });
  }
  return out.map((need) => ({ ...need, words: keepUnits(need.words) }));
}

/** A reset names what it clears, on its own button. */
export const resetWords = (cause: { readonly words: string }): string =>
  `Reset, naming: ${cause.words}`;

const seconds = (ms: number): string => `${(ms / 1000).toFixed(2)}\u00a0s`;

/** What holds when everybody leaves, from the permit's term and the stage's fall time. */
export function promise(now: Snapshot): string[] {
  if (now.enforcement !== "permit") return [now.enforced];
  if (now.state === "offline") return ["No controller is connected, so nothing can be said of it."];
  const { term_ms, fall_ms, loopDelayWorst_ms, rate_perS } = now.link;
  const out = [
    `With this computer dead, dark within ${seconds(term_ms + fall_ms)}: the permit's term and the stage's fall time.`,
  ];
  if (now.caseTrip_degC !== null) {
    out.push(`The case at ${now.caseTrip_degC}\u00a0°C cuts the light.`);
  }
  if (loopDelayWorst_ms !== null) {
    out.push(
      `Permits arrive ${Math.round(loopDelayWorst_ms)}\u00a0ms after their sample at worst, at ${Math.round(rate_perS)} samples a second.`,
    );
  }
  return out;
}
