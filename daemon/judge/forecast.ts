import { isLit } from "./cut.ts";
import type { Plan } from "./plan.ts";
import { MINUTE, type State } from "./state.ts";

/**
 * A first forecast: the slope of the case temperature over the last minute, and from it the time
 * until the ceiling meets what is asked. A straight line drawn on; it claims nothing beyond its
 * horizon, and nothing where the slope is not clear of its own noise.
 */

const SECOND_ms = 1000;
/** Means before a slope is told, seconds. */
const MEANS_MIN = 20;
/** How far ahead a straight line is believed, seconds: the case settles on its way there. */
export const HORIZON_s = 1800;
/** A slope under this many of its standard errors is called level. */
const CLEAR = 3;

/** Gathers the temperature into one-second means, and with each new one looks ahead. */
export function takeForecast(plan: Plan, state: State): void {
  takeMean(state);
  // Called for every sample, although they act once a second: the engine compiles only what is
  // called often, and what is not compiled allocates.
  takeSlope(state);
  takeTimeToCap(plan, state);
}

function takeMean(state: State): void {
  state.meanIsNew = 0;
  if (!Number.isFinite(state.case_degC)) {
    forgetForecast(state);
    return;
  }
  if (Number.isNaN(state.secondSince_board_ms)) state.secondSince_board_ms = state.board_ms;
  if (state.board_ms - state.secondSince_board_ms >= SECOND_ms && state.secondCount > 0) {
    state.minute[state.minuteCount % MINUTE] = state.secondSum_K / state.secondCount;
    state.minuteCount++;
    state.secondSince_board_ms = state.board_ms;
    state.secondSum_K = 0;
    state.secondCount = 0;
    state.meanIsNew = 1;
  }
  state.secondSum_K += state.case_degC;
  state.secondCount++;
}

/** After a gap or a new connection the old means say nothing of now. */
export function forgetForecast(state: State): void {
  state.minuteCount = 0;
  state.secondSum_K = 0;
  state.secondCount = 0;
  state.secondSince_board_ms = Number.NaN;
  state.caseSlope_KperS = Number.NaN;
  state.timeToCap_s = Number.NaN;
}

/** Least-squares slope over the means kept; zero where it is not clear of its standard error. */
function takeSlope(state: State): void {
  if (state.meanIsNew === 0) return;
  const kept = Math.min(state.minuteCount, MINUTE);
  state.caseSlope_KperS = Number.NaN;
  if (kept < MEANS_MIN) return;
  const first = state.minuteCount - kept;
  let sum = 0;
  for (let i = 0; i < kept; i++) sum += state.minute[(first + i) % MINUTE] as number;
  const mean = sum / kept;
  const middle = (kept - 1) / 2;
  let xx = 0;
  let xy = 0;
  let yy = 0;
  for (let i = 0; i < kept; i++) {
    const x = i - middle;
    const y = (state.minute[(first + i) % MINUTE] as number) - mean;
    xx += x * x;
    xy += x * y;
    yy += y * y;
  }
  const slope = xy / xx;
  const left = Math.max(0, yy - slope * xy);
  const error = Math.sqrt(left / (kept - 2) / xx);
  state.caseSlope_KperS = Math.abs(slope) > CLEAR * error ? slope : 0;
}

/** Walks the table toward warmer entries until the ceiling is under what is asked. */
function takeTimeToCap(plan: Plan, state: State): void {
  if (state.meanIsNew === 0) return;
  state.timeToCap_s = Number.NaN;
  const slope = state.caseSlope_KperS;
  if (!isLit(state) || state.capped === 1 || !(state.asked_mA > 0) || !(slope > 0)) return;
  const { ceiling_mA, case_degC, warmer, shift, count_min } = plan.case;
  const warmest_degC = state.case_degC + slope * HORIZON_s;
  let i = (state.case_counts - count_min) >> shift;
  while (i >= 0 && i < case_degC.length) {
    const there_degC = case_degC[i] as number;
    if (there_degC > warmest_degC) return;
    if ((ceiling_mA[i] as number) < state.asked_mA) {
      state.timeToCap_s = Math.max(0, (there_degC - state.case_degC) / slope);
      return;
    }
    i += warmer;
  }
}
