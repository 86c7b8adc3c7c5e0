import { isLit, trip } from "./cut.ts";
import { eventHazardOf, HAZARDS, SAMPLES, SIGN } from "./hazards.ts";
import type { Plan } from "./plan.ts";
import { type Out, STATE } from "./records.ts";
import { ROWS, type State } from "./state.ts";
import { EVENT, tell } from "./tell.ts";

/**
 * Judges every row of the hazard table on one sample: a warning stands after its on-delay and until
 * the value has been back by the deadband for the off-delay; a trip cuts after its own delay and
 * number of samples. Delays count the controller's clock, so that a stall of the host neither
 * lengthens nor shortens them.
 */

/** A warning is over only after this long, so that one that flickers is told once. */
export const OFF_DELAY_ms = 2000;

const TRIPS_WHEN_LIT = Int8Array.from(HAZARDS, (row) => (row.trips === "lit" ? 1 : 0));
const TRIPS_CONNECTED = Int8Array.from(HAZARDS, (row) => (row.trips === "connected" ? 1 : 0));
const DOUBTFUL = Int8Array.from(HAZARDS, (row) => (row.doubt ? 1 : 0));

/** Measures all rows on the sample just taken. */
export function measureRows(plan: Plan, state: State): void {
  state.warnValue.fill(Number.NaN);
  state.tripValue.fill(Number.NaN);
  for (let row = 0; row < ROWS; row++) HAZARDS[row]?.measure(plan, state, row);
}

/** Whether a value stands on the dangerous side of a level, or on it. NaN never does. */
function isBeyond(row: number, value: number, level: number): boolean {
  return (SIGN[row] as number) > 0 ? value >= level : value <= level;
}

/** Warns where a row has stood beyond its warning level, and says when that is over. */
export function judgeWarnings(plan: Plan, state: State, out: Out): void {
  for (let row = 0; row < ROWS; row++) {
    const value = state.warnValue[row] as number;
    const level = plan.warn[row] as number;
    if (state.warned[row] !== 0) judgeOver(plan, state, out, row);
    else if (isBeyond(row, value, level)) {
      if (Number.isNaN(state.warnSince[row] as number)) state.warnSince[row] = state.board_ms;
      const stood_ms = state.board_ms - (state.warnSince[row] as number);
      if (stood_ms < (plan.warnDelay_ms[row] as number)) continue;
      state.warned[row] = 1;
      state.warnOver[row] = Number.NaN;
      tell(out, EVENT.warning, eventHazardOf(row), value, level);
    } else state.warnSince[row] = Number.NaN;
  }
}

function judgeOver(plan: Plan, state: State, out: Out, row: number): void {
  const value = state.warnValue[row] as number;
  const level = plan.warn[row] as number;
  const back = level - (SIGN[row] as number) * (plan.deadband[row] as number);
  if (isBeyond(row, value, back)) {
    state.warnOver[row] = Number.NaN;
    return;
  }
  if (Number.isNaN(state.warnOver[row] as number)) state.warnOver[row] = state.board_ms;
  if (state.board_ms - (state.warnOver[row] as number) < OFF_DELAY_ms) return;
  state.warned[row] = 0;
  state.warnSince[row] = Number.NaN;
  tell(out, EVENT["warning-over"], eventHazardOf(row), value, level);
}

/** Cuts where a row has stood beyond its trip level; the first row of the table is the first-out. */
export function judgeTrips(plan: Plan, state: State, out: Out): void {
  const lit = isLit(state) ? 1 : 0;
  const connected = state.state === STATE.tripped ? 0 : 1;
  for (let row = 0; row < ROWS; row++) {
    if (!standsBeyond(plan, state, row)) continue;
    const acts =
      ((TRIPS_WHEN_LIT[row] as number) & lit) | ((TRIPS_CONNECTED[row] as number) & connected);
    if (acts === 0) continue;
    const value = state.tripValue[row] as number;
    trip(state, out, HAZARDS[row]?.cause ?? 255, value, plan.trip[row] as number);
    return;
  }
}

/** Follows how long a row stands beyond its trip level; whether it has done so for its delay. */
export function standsBeyond(plan: Plan, state: State, row: number): boolean {
  if (!isBeyond(row, state.tripValue[row] as number, plan.trip[row] as number)) {
    state.tripSince[row] = Number.NaN;
    state.tripSamples[row] = 0;
    return false;
  }
  if (state.tripSamples[row] === 0) state.tripSince[row] = state.board_ms;
  state.tripSamples[row] = (state.tripSamples[row] as number) + 1;
  return hasStood(plan, state, row);
}

/** Whether a row has stood for its delay, to the nearest sample, over enough samples. */
function hasStood(plan: Plan, state: State, row: number): boolean {
  if ((state.tripSamples[row] as number) < (SAMPLES[row] as number)) return false;
  const stood_ms = state.board_ms - (state.tripSince[row] as number);
  return stood_ms >= (plan.tripDelay_ms[row] as number) - plan.period_ms / 2;
}

/** Whether the reading behind a permit is in doubt: no permit is made on it, trip or not. */
export function inDoubt(plan: Plan, state: State): boolean {
  if (state.frozen === 1 || state.tickJumped === 1) return true;
  for (let row = 0; row < ROWS; row++) {
    if (DOUBTFUL[row] === 0) continue;
    if (isBeyond(row, state.tripValue[row] as number, plan.trip[row] as number)) return true;
  }
  return !Number.isFinite(state.case_degC);
}
