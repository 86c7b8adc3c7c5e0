/**
 * What a link session can report beside samples. Codes are indexes into this list and are recorded
 * in the journal of the judge's inputs, so the order never changes: new facts go to the end.
 */
export const LINK_FACTS = [
  /** The port opened. Nothing is known of the board yet. */
  "port-open",
  /** The port closed; `text` says why. Nothing stays queued. */
  "port-closed",
  /** Introduction complete, manifest checked. `value`: the boot counter as stored. */
  "introduced",
  /** The board speaks another version: `value`. The link stops there. */
  "wrong-version",
  /** The introduction stayed unusable; `text` names all problems. The link stops there. */
  "not-introduced",
  /** Another serial number than expected answered; `text` names both. Comes before "introduced". */
  "board-changed",
  /** The board started anew; `value` 1 by its banner, 2 by its counters. It is asked again. */
  "board-reset",
  /** The board holds the wanted curve, loaded now or already held. `value`: points. */
  "curve-loaded",
  /** The curve could not be loaded. `value`: REASONS index or −1; `text` says at what. */
  "curve-failed",
  /** A session is open. `text`: its token. */
  "armed",
  /** Arming was refused. `value`: REASONS index or −1; `text`: the reason. */
  "arm-refused",
  /** A sample after an ordered dark says neither emitting nor armed. `value`: its cause code. */
  "dark-confirmed",
  /** The board's latch is cleared. `value`: the cause cleared. */
  "reset-done",
  /** Reset was refused. `value`: REASONS index or −1; `text`: the reason. */
  "reset-refused",
  /** A permit was refused by the board, or not sent. `value`: REASONS index or −1. */
  "permit-refused",
  /** A permit was made for a sample that is no anchor; not sent. `value`: the sample number. */
  "anchor-missing",
  /** An ask stayed unanswered and is given up. `value`: tries; `text`: the verb. */
  "no-answer",
  /** Sample numbers were skipped. `value`: how many. */
  "lost",
  /** A sample came again and was dropped. `value`: its number. */
  "duplicate",
  /** An older sample came late and was dropped. `value`: its number. */
  "reordered",
  /** No good line for three sample periods. `value`: milliseconds so far. */
  "silence",
  /** Lines come again. `value`: milliseconds that the silence lasted. */
  "back",
  /** Broken lines came. `value`: how many since the last such fact; `text`: the latest kind. */
  "garbled",
  /** Words from the board for a person: `text`. */
  "said",
] as const;
export type LinkFact = (typeof LINK_FACTS)[number];

/** Code of a fact, its index. */
export const linkFactCode = (fact: LinkFact): number => LINK_FACTS.indexOf(fact);
