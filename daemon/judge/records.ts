import type { Sample } from "../model/sample.ts";

/**
 * The records that the supervising step reads and fills. All are preallocated and flat: numbers and
 * typed arrays only, so that a step allocates nothing and the same bytes in give the same bytes out.
 */

/** Counts up whenever the meaning of a record changes; stored with every recording. */
export const JUDGE_VERSION = 1;

/** Kinds of input. */
export const INPUT = { sample: 0, request: 1, link: 2, deadline: 3 } as const;

/** What people and programs may ask of the judge. `value` by request is named beside each. */
export const REQUESTS = [
  "arm", // value: the current meant, mA
  "set", // value: the current meant, mA
  "dark", // value: 0
  "reset", // value: the cause being cleared
  "stop", // value: cause code of the dark that the daemon leaves behind (0 a person)
] as const;
export type RequestName = (typeof REQUESTS)[number];
export const REQUEST = { arm: 0, set: 1, dark: 2, reset: 3, stop: 4 } as const;

/** Who asks. "act" is a page on another machine whose arming needs an act at the bench. */
export const ASKERS = ["person", "page", "script", "away", "scripted-person"] as const;
export type Asker = (typeof ASKERS)[number];

/** Why a request is refused. Words for people are in words.ts. */
export const REFUSALS = [
  "none",
  "offline",
  "not-standby",
  "not-armed",
  "tripped",
  "not-tripped",
  "above-ceiling",
  "below-zero",
  "key-off",
  "loop-open",
  "no-curve",
  "sensor",
  "case-warm",
  "needs-hand",
  "lockout",
  "busy",
  "board",
  "wrong-cause",
  "watch-only",
  "not-built-in",
  "no-answer",
  "went-dark",
] as const;
export type Refusal = (typeof REFUSALS)[number];

/** One input of the judge. The unused fields of a kind are 0; `sample` is kept by reference. */
export interface Input {
  /** Ordinal of this input, ascending by one from 1. */
  n: number;
  kind: number;
  now_ms: number;
  sample: Sample;
  /** Controller's clock against the host's: relative drift (0.01 is 1 %) and jump since last, ms. */
  drift: number;
  jump_ms: number;
  /** 1 where no newer sample was read with this one, and where all lines written before have left.
   * A permit is made only where both hold; they are recorded, so that a replay decides the same. */
  newest: number;
  portDrained: number;
  request: number;
  asker: number;
  /** Returned with the answer, so that the switch finds who asked. */
  requestId: number;
  value: number;
  /** Index into LINK_FACTS, and its number. */
  fact: number;
  factValue: number;
}

/** States, as people see them. */
export const STATES = ["offline", "standby", "armed", "emitting", "tripped"] as const;
export const STATE = { offline: 0, standby: 1, armed: 2, emitting: 3, tripped: 4 } as const;

/** How a bench is watched: not at all (it takes permits), with no way to cut, or with one. */
export const WATCH = { none: 0, only: 1, text: 2, line: 3, toggled: 4 } as const;

export const FLAG = {
  capped: 1,
  winding: 2,
  unattended: 4,
  bypassed: 8,
  watchOnly: 16,
  delay: 32,
  unheard: 64,
  /** Watched, and a cut-off is named: a trip cuts, but no permit is needed for light. */
  cutOff: 128,
};

/** Where everything stands after a step: what pages, status and the record's derived channels show. */
export interface View {
  state: number;
  flags: number;
  /** Cause of the latch while tripped, else of the last dark; −1 before any. */
  cause: number;
  /** Asked by a person, mA; what the permit aims at; what flows. NaN where not known. */
  asked_mA: number;
  aim_mA: number;
  current_mA: number;
  case_degC: number;
  output_mW: number;
  ceiling_mA: number;
  /** Index into MAKERS. */
  maker: number;
  floor_mA: number;
  margin_mA: number;
  headroom_mA: number;
  /** Output that the model expects at this current and case, mW. */
  expected_mW: number;
  /** Slope of the case temperature over the last minute, K/s; NaN until known. */
  caseSlope_KperS: number;
  /** Seconds until the ceiling meets the asked current at the present slope; NaN for never/unknown. */
  timeToCap_s: number;
  /** Left of the emission delay as the judge reckons it, ms. */
  delayLeft_ms: number;
  /** True loop delay of the last permit and the session's worst, ms; NaN before any. */
  loopDelay_ms: number;
  loopDelayWorst_ms: number;
}

export const EVENTS_PER_STEP_MAX = 16;

/** What a step orders and tells. Refilled by each step; the caller carries it out at once. */
export interface Out {
  /** Cause code of a dark to send now, or −1. Carried out before anything else. */
  dark: number;
  /** 1 where a permit is due; then its four numbers. The only thing that can raise current. */
  permit: number;
  permitSeq: number;
  cap_counts: number;
  aim_counts: number;
  term_ticks: number;
  /** An exchange for the link to begin: see ORDER. */
  order: number;
  orderValue: number;
  /** Answer to a request: see ANSWER; `answerValue` is e.g. the highest current allowed, mA. */
  answer: number;
  answerId: number;
  refusal: number;
  answerValue: number;
  /** When the step wants to be called with kind deadline, monotonic ms; Infinity for never. */
  deadline_ms: number;
  /** Events of this step: kinds (EVENT_KINDS), hazard (cause code, or −1 − index of HAZARD_IDS for
   * rows that only warn; −100 for none), two numbers each. */
  eventCount: number;
  eventKind: Int32Array;
  eventHazard: Int32Array;
  eventA: Float64Array;
  eventB: Float64Array;
  view: View;
}
export const ORDER = { none: 0, arm: 1, reset: 2 } as const;
export const ANSWER = { none: 0, done: 1, refused: 2, begun: 3 } as const;
export const NO_HAZARD = -100;
