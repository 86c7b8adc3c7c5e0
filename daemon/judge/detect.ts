import { STATUS } from "../model/sample.ts";
import { isLit } from "./cut.ts";
import type { Plan } from "./plan.ts";
import { STATE } from "./records.ts";
import type { State } from "./state.ts";

/**
 * What each hazard row measures on a sample. A function here compares nothing with a level: it
 * writes the row's values, or leaves them NaN where the row has no meaning now (suppressed by
 * design). The values were cleared to NaN before.
 */

/** Photodiode at or above this share of its scale is saturated: output rows know nothing. */
const SATURATED_SHARE = 0.97;
/** Lost output is judged only where current is well above the floor. */
const ABOVE_FLOOR = 1.2;
/** Light and current may take this long beyond the fall time to leave the averaged readings, ms. */
const SETTLE_ms = 60;

/** Rows that are judged elsewhere: by a deadline or a link fact. */
export function nothing(): void {}

/** Difference that a converter's last digits can make, mA. */
const slack_mA = (plan: Plan): number => Math.max(2 * plan.current.perCount, 2 * plan.set.perCount);

/** Measured (or commanded) current as a share of the highest ceiling of the window. */
export function overCeiling(plan: Plan, state: State, row: number): void {
  if (!isLit(state)) return;
  const flowing_mA = Math.max(state.current_mA, state.set_mA);
  const ceiling_mA = state.ceilingHighest_mA;
  const inDigits = flowing_mA <= ceiling_mA + slack_mA(plan);
  const share = flowing_mA / ceiling_mA;
  state.tripValue[row] = inDigits ? 0 : share;
  // While capped the current stands at its ceiling by design.
  if (state.capped === 0 && state.set_mA > 0) state.warnValue[row] = share;
}

/** How far the current lies above the highest set of the window: a ramp is followed with a lag. */
export function followHigh(plan: Plan, state: State, row: number): void {
  if (!isLit(state) || !(state.setHighest_mA > 0)) return;
  follow(plan, state, row, state.current_mA - state.setHighest_mA, state.setHighest_mA);
}

/** How far the current lies below the lowest set of the window. */
export function followLow(plan: Plan, state: State, row: number): void {
  if (!isLit(state) || !(state.setLowest_mA > 0)) return;
  follow(plan, state, row, state.setLowest_mA - state.current_mA, state.setLowest_mA);
}

function follow(plan: Plan, state: State, row: number, off_mA: number, aim_mA: number): void {
  const share = off_mA > Math.max(slack_mA(plan), plan.current.error) ? off_mA / aim_mA : 0;
  state.warnValue[row] = share;
  state.tripValue[row] = share;
}

/** Median of the last five temperatures; silent where the sensor itself is at fault. */
export function caseOver(_plan: Plan, state: State, row: number): void {
  if (!Number.isFinite(state.caseMedian_degC)) return;
  state.warnValue[row] = state.caseMedian_degC;
  state.tripValue[row] = state.caseMedian_degC;
}

/** Share of its divider that the case sensor reads: high while open, low while shorted. */
export function caseDivider(plan: Plan, state: State, row: number): void {
  const share = state.case_counts * plan.caseShare.perCount + plan.caseShare.offset;
  state.warnValue[row] = share;
  state.tripValue[row] = share;
}

/** Counts by which the worst judged channel lies outside what its converter can give. */
export function sensorRange(_plan: Plan, state: State, row: number): void {
  state.warnValue[row] = state.outside_counts;
  state.tripValue[row] = state.outside_counts;
}

/** Difference of rate; a clock that ran backwards or jumped is beyond any level. */
export function tickDrift(_plan: Plan, state: State, row: number): void {
  state.warnValue[row] = Math.abs(state.drift);
  state.tripValue[row] = Math.abs(state.drift);
}

export function key(_plan: Plan, state: State, row: number): void {
  state.tripValue[row] = (state.status & STATUS.key) === 0 ? 1 : 0;
}

export function loop(_plan: Plan, state: State, row: number): void {
  state.tripValue[row] = (state.status & STATUS.loop) === 0 ? 1 : 0;
}

/** Whether the bench has been dark for long enough that current and light must be gone. */
function isSettledDark(plan: Plan, state: State): boolean {
  const dark_ms = state.board_ms - state.darkSince_board_ms;
  return dark_ms > plan.fall_ms + 2 * plan.period_ms + SETTLE_ms;
}

export function darkCurrent(plan: Plan, state: State, row: number): void {
  if (!isSettledDark(plan, state)) return;
  state.warnValue[row] = state.current_mA;
  state.tripValue[row] = state.current_mA;
}

export function darkLight(plan: Plan, state: State, row: number): void {
  if (!isSettledDark(plan, state)) return;
  state.warnValue[row] = state.photodiodeShare;
  state.tripValue[row] = state.photodiodeShare;
}

/** Output as a share of what diode and crystal of the bench file would give. */
export function outputLow(plan: Plan, state: State, row: number): void {
  if (state.state !== STATE.emitting || !plan.outputKnown) return;
  if (state.photodiodeShare >= SATURATED_SHARE) return;
  // Above the floor all through the window: light needs the stage's time to come.
  if (!(state.setLowest_mA > ABOVE_FLOOR * state.floor_mA) || !(state.expected_mW > 0)) return;
  const share = state.output_mW / state.expected_mW;
  state.warnValue[row] = share;
  state.tripValue[row] = share;
}

/** Distance from the floor as a share of the current; −1 where the crystal cannot lase at all. */
export function marginLow(_plan: Plan, state: State, row: number): void {
  if (state.state !== STATE.emitting || !(state.setLowest_mA > 0)) return;
  if (Number.isNaN(state.floor_mA)) return;
  const share = (state.current_mA - state.floor_mA) / state.current_mA;
  state.warnValue[row] = Math.max(-1, share);
}

/** Age of the last permit on arrival as a share of its term. */
export function permitAge(plan: Plan, state: State, row: number): void {
  if (!isLit(state)) return;
  state.warnValue[row] = state.ackAge_ms / plan.term_ms;
}

export function curveDiffers(_plan: Plan, state: State, row: number): void {
  state.tripValue[row] = (state.status & STATUS.curve) === 0 ? 1 : 0;
}

/** Time armed at zero current, ms. */
export function darkTime(_plan: Plan, state: State, row: number): void {
  if (!isLit(state)) return;
  state.tripValue[row] = state.board_ms - state.zeroSince_board_ms;
}
