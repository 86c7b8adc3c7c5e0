import { judgeTrips, judgeWarnings, measureRows, standsBeyond } from "./alarm.ts";
import { isLit } from "./cut.ts";
import { takeForecast } from "./forecast.ts";
import { eventHazardOf, rowOf } from "./hazards.ts";
import { feedOneShot } from "./permit.ts";
import type { Plan } from "./plan.ts";
import { type Input, NO_HAZARD, type Out, STATE, WATCH } from "./records.ts";
import { ROWS, type State } from "./state.ts";
import { EVENT, tell } from "./tell.ts";

/**
 * Judging a bench that takes no permits. Its state is what its current shows; rows warn. Where a
 * cut-off is named, a trip drives it and latches; where none is, a passed limit is told as one that
 * nothing here can act on.
 */

const DARK_CURRENT = rowOf("dark-current");
/** Light counts as gone only this far under the current at which it counted as there. */
const GONE_SHARE = 0.8;
/** Current from which a bench counts as emitting where its file has no trip for dark-current, mA. */
const EMITS_mA = 20;

/** The rest of a sample's judging, once its readings and its place in the corridor are taken. */
export function judgeWatched(plan: Plan, state: State, input: Input, out: Out): void {
  followLight(plan, state, out);
  takeDarkSince(state);
  measureRows(plan, state);
  if (plan.watch === WATCH.only) judgeLimits(plan, state, out);
  else judgeTrips(plan, state, out);
  judgeWarnings(plan, state, out);
  // The forecast is for the current that flows: nobody asks for one here.
  state.asked_mA = isLit(state) ? state.current_mA : 0;
  takeForecast(plan, state);
  if (plan.watch === WATCH.toggled) feedOneShot(plan, state, input, out);
}

/** Standby and emitting are what the current shows; without a current nobody can say. */
function followLight(plan: Plan, state: State, out: Out): void {
  if (state.state === STATE.tripped) return;
  const level = plan.trip[DARK_CURRENT] as number;
  const emits_mA = Number.isNaN(level) ? EMITS_mA : level;
  if (state.state !== STATE.emitting && state.current_mA >= emits_mA) {
    state.state = STATE.emitting;
    tell(out, EVENT["light-seen"], NO_HAZARD, state.current_mA, state.case_degC);
  } else if (state.state === STATE.emitting && state.current_mA < emits_mA * GONE_SHARE) {
    state.state = STATE.standby;
    tell(out, EVENT["light-gone"], NO_HAZARD, state.current_mA, state.case_degC);
  }
}

/** After a cut the current must go; before one, darkness is nobody's promise. */
function takeDarkSince(state: State): void {
  if (state.state !== STATE.tripped) state.darkSince_board_ms = Number.NaN;
  else if (Number.isNaN(state.darkSince_board_ms)) state.darkSince_board_ms = state.board_ms;
}

/** Marks a row in `warned` whose limit was passed, beside the 1 of a warning. */
const PASSED = 2;

/** Tells each limit that is passed, once, until the row's warning is over. */
function judgeLimits(plan: Plan, state: State, out: Out): void {
  for (let row = 0; row < ROWS; row++) {
    if (!standsBeyond(plan, state, row) || state.warned[row] === PASSED) continue;
    state.warned[row] = PASSED;
    state.warnOver[row] = Number.NaN;
    const value = state.tripValue[row] as number;
    tell(out, EVENT.unenforced, eventHazardOf(row), value, plan.trip[row] as number);
  }
}
