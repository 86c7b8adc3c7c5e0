import { counterDistance } from "../model/times.ts";
import { isLit } from "./cut.ts";
import type { Plan, Scale } from "./plan.ts";
import type { Input } from "./records.ts";
import { MEDIAN, type State } from "./state.ts";

/** Takes one sample into the state: its clock first, then its readings in units. */

/** A clock that is ahead by more than this many sample periods at once has jumped. */
const JUMP_PERIODS = 2;
/** And by at least this, ms: below it the jitter of an adapter could be behind it. */
const JUMP_ms_MIN = 100;

/**
 * Takes the sample's number and tick.
 * @returns whether the sample is newer than the last; an old one must not be judged
 */
export function takeClock(plan: Plan, state: State, input: Input): boolean {
  const { sample } = input;
  const known = state.sampled === 1;
  const newer = counterDistance(sample.seq, state.seq) > 0;
  // A dark board may have started its numbers anew; a lit one may not.
  if (known && !newer && isLit(state)) return false;
  const ticks = known ? counterDistance(sample.tick, state.tick) : 0;
  // Two samples within one tick are legal only where samples come nearly as fast as ticks.
  const mayStand = plan.period_ms < 2 * plan.tick_ms;
  const backwards = known && (mayStand ? ticks < 0 : ticks <= 0);
  const limit_ms = Math.max(JUMP_ms_MIN, JUMP_PERIODS * plan.period_ms);
  state.tickJumped = backwards || Math.abs(input.jump_ms) > limit_ms ? 1 : 0;
  if (known && !backwards) state.board_ms += ticks * plan.tick_ms;
  state.frozen = known && sample.conversions === state.conversions ? 1 : 0;
  state.sampled = 1;
  state.sampled_mono_ms = input.now_ms;
  state.seq = sample.seq;
  state.tick = sample.tick;
  state.status = sample.status;
  state.boardCause = sample.cause;
  state.conversions = sample.conversions;
  state.drift = input.drift;
  takeLoopDelay(plan, state, input);
  return true;
}

/** The age at which the board received the last permit: the true loop delay, on one clock. */
function takeLoopDelay(plan: Plan, state: State, input: Input): void {
  const { ackSeq, ackAge_ticks } = input.sample;
  if (ackSeq < 0 || ackAge_ticks < 0) {
    state.ackAge_ms = Number.NaN;
    return;
  }
  state.ackAge_ms = ackAge_ticks * plan.tick_ms;
  state.loopDelay_ms = state.ackAge_ms;
  if (!(state.loopDelay_ms <= state.loopDelayWorst_ms)) {
    state.loopDelayWorst_ms = state.loopDelay_ms;
  }
}

/** Turns the judged channels into units, and finds what lies outside its range. */
export function takeReadings(plan: Plan, state: State, input: Input): void {
  const { values } = input.sample;
  const set_counts = values[plan.set.channel] as number;
  const current_counts = values[plan.current.channel] as number;
  const photodiode_counts = values[plan.photodiode.channel] as number;
  const case_counts = values[plan.caseChannel] as number;
  // Zero counts of set mean off, whatever the offset of its scale.
  state.set_mA = set_counts === 0 ? 0 : set_counts * plan.set.perCount + plan.set.offset;
  state.current_mA = current_counts * plan.current.perCount + plan.current.offset;
  state.case_counts = case_counts;
  const { count_min, count_max } = plan.photodiode;
  state.photodiodeShare = (photodiode_counts - count_min) / (count_max - count_min);
  state.output_mW = plan.outputKnown
    ? photodiode_counts * plan.photodiode.perCount + plan.photodiode.offset
    : Number.NaN;
  state.outside_counts = Math.max(
    outside(plan.set, set_counts),
    outside(plan.current, current_counts),
    outside(plan.photodiode, photodiode_counts),
    plan.case.count_min - case_counts,
    case_counts - plan.case.count_max,
    0,
  );
}

const outside = (scale: Scale, counts: number): number =>
  Math.max(scale.count_min - counts, counts - scale.count_max);

/** Median of the last five case temperatures, of as many as there are. */
export function takeMedian(state: State): void {
  state.median[state.medianCount % MEDIAN] = state.case_degC;
  state.medianCount++;
  const kept = Math.min(state.medianCount, MEDIAN);
  const { median, sorted } = state;
  for (let i = 0; i < kept; i++) {
    const value = median[i] as number;
    let at = i;
    while (at > 0 && (sorted[at - 1] as number) > value) {
      sorted[at] = sorted[at - 1] as number;
      at--;
    }
    sorted[at] = value;
  }
  // Of an even number the warmer of the middle two.
  state.caseMedian_degC = sorted[kept >> 1] as number;
}
