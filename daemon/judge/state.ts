import { HAZARD_IDS } from "../model/bench.ts";
import { causeOf } from "../model/cause.ts";
import { newSample } from "../model/sample.ts";
import {
  ANSWER,
  EVENTS_PER_STEP_MAX,
  INPUT,
  type Input,
  JUDGE_VERSION,
  ORDER,
  type Out,
  STATE,
  type View,
} from "./records.ts";

/** Rows of the hazard table; the length of every array that has one entry a row. */
export const ROWS = HAZARD_IDS.length;
/** Samples kept for "the highest of the last fall time": 256 at 1000/s is a quarter second. */
export const WINDOW = 256;
/** Samples whose median is the case temperature that can trip. */
export const MEDIAN = 5;
/** One-second means of the case temperature, from which its slope is taken. */
export const MINUTE = 60;

/** An exchange with the board that a person waits for. */
export const PENDING = { none: 0, waiting: 1, cancelled: 2 } as const;

const HOST_RESTARTED = 84;

/** Every number that the judge remembers. `board` times count the controller's clock, `mono` ours. */
const NUMBERS = {
  /** Index into STATES. */
  state: STATE.offline as number,
  connected: 0,
  /** Cause of the latch while tripped, else of the last dark; −1 before any. */
  cause: -1,
  /** 1 where a trip found at start has not been told as an event yet. */
  untold: 0,

  // The last sample: what the board said, and when.
  now_mono_ms: 0,
  sampled: 0,
  sampled_mono_ms: 0,
  seq: 0,
  tick: 0,
  board_ms: 0,
  status: 0,
  boardCause: 0,
  conversions: -1,
  /** 1 where the converter counted no conversion since the last sample. */
  frozen: 0,
  /** 1 where the board's clock ran backwards or jumped with this sample. */
  tickJumped: 0,
  gapWarned: 0,
  drift: 0,
  loopDelay_ms: Number.NaN,
  loopDelayWorst_ms: Number.NaN,
  ackSeq: -1,
  ackAge_ms: Number.NaN,

  /** How the bench is watched (WATCH of watch-plan.ts); 0 for a board that takes permits. */
  watch: 0,

  // Its readings.
  case_counts: 0,
  case_degC: Number.NaN,
  caseMedian_degC: Number.NaN,
  current_mA: Number.NaN,
  set_mA: Number.NaN,
  output_mW: Number.NaN,
  photodiodeShare: Number.NaN,
  /** Counts by which the worst judged channel lies outside its range. */
  outside_counts: 0,

  // The corridor there.
  ceiling_mA: Number.NaN,
  cap_counts: 0,
  ceilingHighest_mA: Number.NaN,
  setHighest_mA: Number.NaN,
  setLowest_mA: Number.NaN,
  maker: 0,
  floor_mA: Number.NaN,
  expected_mW: Number.NaN,

  // What people asked for, and how far the cap lets it.
  asked_mA: 0,
  aim_mA: 0,
  capped: 0,
  allowed_mA: Number.POSITIVE_INFINITY,
  cappedAt_degC: Number.NaN,
  coolSince_board_ms: Number.NaN,

  // The session: from arming to dark.
  sawArmed: 0,
  armed_mono_ms: 0,
  lit: 0,
  zeroSince_board_ms: Number.NaN,
  delaySince_board_ms: Number.NaN,
  permits: 0,
  permitTick: 0,
  permit_board_ms: 0,

  // Dark: since when, and what was ordered until the board reports it.
  darkSince_board_ms: Number.NaN,
  darkOrdered: -1,
  darkOrdered_mono_ms: Number.NaN,

  // Exchanges under way.
  arming: PENDING.none as number,
  armingId: 0,
  arming_mA: 0,
  armingUntil_mono_ms: Number.POSITIVE_INFINITY,
  resetting: PENDING.none as number,
  resettingId: 0,
  resettingUntil_mono_ms: Number.POSITIVE_INFINITY,

  // Rings' heads.
  windowCount: 0,
  medianCount: 0,
  minuteCount: 0,
  /** 1 in the step that completed a mean. */
  meanIsNew: 0,
  secondSum_K: 0,
  secondCount: 0,
  secondSince_board_ms: Number.NaN,
  caseSlope_KperS: Number.NaN,
  timeToCap_s: Number.NaN,
};

/** Arrays that the judge remembers, and their lengths. */
const ARRAYS = {
  /** Values of the hazard rows as measured last; NaN where a row says nothing now. */
  warnValue: ROWS,
  tripValue: ROWS,
  /** Since when a row stands beyond its level, and within it again, board ms; NaN for not. */
  warnSince: ROWS,
  warnOver: ROWS,
  warned: ROWS,
  tripSince: ROWS,
  tripSamples: ROWS,
  windowTime: WINDOW,
  windowCeiling: WINDOW,
  windowSet: WINDOW,
  median: MEDIAN,
  sorted: MEDIAN,
  minute: MINUTE,
} as const;

type Numbers = { -readonly [K in keyof typeof NUMBERS]: number };
type Arrays = { [K in keyof typeof ARRAYS]: Float64Array };

/** Everything the judge remembers between two steps: numbers and arrays of numbers, nothing else. */
export interface State extends Numbers, Arrays {}

const NUMBER_KEYS = Object.keys(NUMBERS) as (keyof Numbers)[];
const ARRAY_KEYS = Object.keys(ARRAYS) as (keyof Arrays)[];

/** Cells that a packed state takes: its version, its numbers, its arrays. */
export const STATE_LENGTH =
  1 + NUMBER_KEYS.length + ARRAY_KEYS.reduce((sum, key) => sum + ARRAYS[key], 0);

/** The state before anything was heard: offline, without a latch. */
export function newState(): State {
  const arrays = Object.fromEntries(ARRAY_KEYS.map((key) => [key, new Float64Array(ARRAYS[key])]));
  const state = { ...NUMBERS, ...arrays } as State;
  clearRows(state);
  return state;
}

/** Forgets how long every hazard row has stood beyond its levels. */
export function clearRows(state: State): void {
  state.warnValue.fill(Number.NaN);
  state.tripValue.fill(Number.NaN);
  state.warnSince.fill(Number.NaN);
  state.warnOver.fill(Number.NaN);
  state.tripSince.fill(Number.NaN);
  state.tripSamples.fill(0);
}

/**
 * Takes up the latch found on disk at start. A latched cause keeps the bench tripped; a lit mark
 * without one means that the daemon ended while the bench was armed, which is a trip of its own.
 * @param cause code of the latch, −1 or a cause that does not latch for none
 */
export function restoreLatch(state: State, cause: number, lit: boolean): void {
  const latched = cause >= 0 && causeOf(cause).latches;
  if (!latched && !lit) return;
  state.state = STATE.tripped;
  state.cause = latched ? cause : HOST_RESTARTED;
  state.untold = latched ? 0 : 1;
}

/** Writes the state into `into` (at least STATE_LENGTH cells), its version first. */
export function packState(state: State, into: Float64Array): void {
  let at = 0;
  into[at++] = JUDGE_VERSION;
  for (const key of NUMBER_KEYS) into[at++] = state[key];
  for (const key of ARRAY_KEYS) {
    into.set(state[key], at);
    at += ARRAYS[key];
  }
}

/** The state that `packState` wrote; null where another version of the judge wrote it. */
export function unpackState(from: Float64Array): State | null {
  if (from[0] !== JUDGE_VERSION || from.length < STATE_LENGTH) return null;
  const state = newState();
  let at = 1;
  for (const key of NUMBER_KEYS) state[key] = from[at++] ?? Number.NaN;
  for (const key of ARRAY_KEYS) {
    state[key].set(from.subarray(at, at + ARRAYS[key]));
    at += ARRAYS[key];
  }
  return state;
}

/** A blank input, to be filled again for every step. */
export const newInput = (): Input => ({
  n: 0,
  kind: INPUT.deadline,
  now_ms: 0,
  sample: newSample(),
  drift: 0,
  jump_ms: 0,
  newest: 0,
  portDrained: 0,
  request: 0,
  asker: 0,
  requestId: 0,
  value: 0,
  fact: 0,
  factValue: 0,
});

const newView = (): View => ({
  state: STATE.offline,
  flags: 0,
  cause: -1,
  asked_mA: Number.NaN,
  aim_mA: Number.NaN,
  current_mA: Number.NaN,
  case_degC: Number.NaN,
  output_mW: Number.NaN,
  ceiling_mA: Number.NaN,
  maker: 0,
  floor_mA: Number.NaN,
  margin_mA: Number.NaN,
  headroom_mA: Number.NaN,
  expected_mW: Number.NaN,
  caseSlope_KperS: Number.NaN,
  timeToCap_s: Number.NaN,
  delayLeft_ms: Number.NaN,
  loopDelay_ms: Number.NaN,
  loopDelayWorst_ms: Number.NaN,
});

/** A blank outcome, refilled by every step. */
export const newOut = (): Out => ({
  dark: -1,
  permit: 0,
  permitSeq: 0,
  cap_counts: 0,
  aim_counts: 0,
  term_ticks: 0,
  order: ORDER.none,
  orderValue: 0,
  answer: ANSWER.none,
  answerId: 0,
  refusal: 0,
  answerValue: Number.NaN,
  deadline_ms: Number.POSITIVE_INFINITY,
  eventCount: 0,
  eventKind: new Int32Array(EVENTS_PER_STEP_MAX),
  eventHazard: new Int32Array(EVENTS_PER_STEP_MAX),
  eventA: new Float64Array(EVENTS_PER_STEP_MAX),
  eventB: new Float64Array(EVENTS_PER_STEP_MAX),
  view: newView(),
});
