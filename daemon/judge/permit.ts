import { STATUS } from "../model/sample.ts";
import { inDoubt } from "./alarm.ts";
import { assert } from "./assert.ts";
import { target_mA } from "./cap.ts";
import { isLit } from "./cut.ts";
import type { Plan } from "./plan.ts";
import { PERMIT_SPACING_ms } from "./plan-parts.ts";
import { type Input, type Out, STATE } from "./records.ts";
import type { State } from "./state.ts";
import { COUNT_DUST } from "./tables.ts";

/**
 * The permit: the only thing in the program that can raise current. One is made for the sample that
 * was judged in this very step, or none.
 */

/** Longest stretch over which an aim is slewed at once, ms: after a pause it does not leap. */
const SLEW_ms_MAX = 1000;

/** Makes a permit for the sample just judged, where one is due and nothing is in doubt. */
export function grantPermit(plan: Plan, state: State, input: Input, out: Out): void {
  if (!isDue(state, input)) return;
  if (inDoubt(plan, state)) return;
  raiseAim(plan, state);
  const { cap_counts } = state;
  const aim_counts = Math.min(aimCounts(plan, state), cap_counts);

  assert(isLit(state) && out.dark < 0, "a permit needs an open session and no dark in this step");
  assert(input.sample.seq === state.seq, "a permit names the sample just judged");
  assert(aim_counts >= 0 && aim_counts <= cap_counts, "the aim is under the cap");
  assert(cap_counts <= plan.absolute_counts, "the cap is under the board's ceiling");
  const cap_mA = cap_counts * plan.set.perCount + plan.set.offset;
  assert(
    cap_counts === 0 || cap_mA <= state.ceiling_mA + COUNT_DUST * plan.set.perCount,
    "the cap is under the ceiling",
  );
  out.permit = 1;
  out.permitSeq = state.seq;
  out.cap_counts = cap_counts;
  out.aim_counts = aim_counts;
  out.term_ticks = plan.term_ticks;
  state.permits++;
  state.permit_board_ms = state.board_ms;
}

function isDue(state: State, input: Input): boolean {
  if (!isLit(state) || state.sawArmed === 0) return false;
  // After a stall only the newest sample may earn a permit, and only into an empty port.
  if (input.newest === 0 || input.portDrained === 0) return false;
  if ((state.status & STATUS.anchor) === 0) return false;
  return state.permits === 0 || state.board_ms - state.permit_board_ms >= PERMIT_SPACING_ms;
}

/** The aim in counts of set, as `toSetCounts` has it; a number passed by itself would be allocated. */
function aimCounts(plan: Plan, state: State): number {
  const { perCount, offset } = plan.set;
  return Math.max(0, Math.floor((state.aim_mA - offset) / perCount + COUNT_DUST));
}

/** Moves the aim toward what the bench shall give: down at once, up by the slew. */
function raiseAim(plan: Plan, state: State): void {
  const target = target_mA(state);
  const since_ms = state.permits === 0 ? 0 : state.board_ms - state.permit_board_ms;
  const step_mA = (plan.slewUp_mAperS * Math.min(since_ms, SLEW_ms_MAX)) / 1000;
  // The board holds current back during the emission delay, and an injected reading is not true:
  // the ramp waits, so that it does not begin at its end.
  const waits = (state.status & (STATUS.delay | STATUS.injected)) !== 0;
  const reach_mA = waits ? state.aim_mA : state.aim_mA + step_mA;
  state.aim_mA = Math.max(0, Math.min(target, reach_mA));
}

/**
 * Feeds the one-shot of a watched bench with the sample just judged: from the same output as a
 * permit, and with no current in it, since the current is set elsewhere.
 */
export function feedOneShot(plan: Plan, state: State, input: Input, out: Out): void {
  if (state.state === STATE.tripped || input.newest === 0) return;
  if (inDoubt(plan, state)) return;
  assert(out.dark < 0, "a one-shot is not fed in a step that cuts");
  out.permit = 1;
  out.permitSeq = state.seq;
  out.term_ticks = plan.term_ticks;
}
