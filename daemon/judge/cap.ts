import type { Plan } from "./plan.ts";
import { NO_HAZARD, type Out } from "./records.ts";
import type { State } from "./state.ts";
import { EVENT, tell } from "./tell.ts";

/**
 * Capping: what is asked, held down by a falling ceiling at once, and let up again only after the
 * case has been `recover_K` cooler than where it was capped for `recover_ms`. Otherwise a ceiling
 * that follows the case, which follows the current, would make the light hunt.
 */
export function takeCap(plan: Plan, state: State, out: Out): void {
  const { asked_mA, ceiling_mA, case_degC } = state;
  if (ceiling_mA < Math.min(asked_mA, state.allowed_mA)) {
    hold(state);
    if (state.capped === 0) {
      state.capped = 1;
      tell(out, EVENT.capped, NO_HAZARD, asked_mA, ceiling_mA);
    }
    return;
  }
  if (state.capped === 0) return;
  // Written so that a temperature that is not known is never cooler.
  if (!(case_degC <= state.cappedAt_degC - plan.recover_K)) {
    state.coolSince_board_ms = Number.NaN;
    return;
  }
  if (Number.isNaN(state.coolSince_board_ms)) state.coolSince_board_ms = state.board_ms;
  if (state.board_ms - state.coolSince_board_ms < plan.recover_ms) return;
  if (ceiling_mA >= asked_mA) {
    release(state);
    tell(out, EVENT.uncapped, NO_HAZARD, asked_mA, ceiling_mA);
  } else {
    hold(state);
  }
}

/** Takes the ceiling of this sample as what is allowed from here on. */
function hold(state: State): void {
  state.allowed_mA = state.ceiling_mA;
  state.cappedAt_degC = state.case_degC;
  state.coolSince_board_ms = Number.NaN;
}

/** Nothing is held down: at arming, at dark, and when a person asks for a current that fits. */
export function release(state: State): void {
  state.capped = 0;
  state.allowed_mA = Number.POSITIVE_INFINITY;
  state.cappedAt_degC = Number.NaN;
  state.coolSince_board_ms = Number.NaN;
}

/** What the bench shall give now, mA: the least of what is asked, allowed and under the ceiling. */
export const target_mA = (state: State): number =>
  Math.min(state.asked_mA, state.allowed_mA, state.ceiling_mA);
