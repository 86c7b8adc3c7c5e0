import { STATUS } from "../model/sample.ts";
import { fallBack, isLit, trip } from "./cut.ts";
import { ANSWER, NO_HAZARD, type Out, STATE } from "./records.ts";
import { PENDING, type State } from "./state.ts";
import { answer, EVENT, tell } from "./tell.ts";

/**
 * Compares what the board says of itself with what the host holds to be so. Whatever ended light
 * without a person's order is a trip; the board's own cause is the first-out where the host had not
 * ordered dark before.
 */

const ARMED_IDLE = 1;
const STATE_DIFFERS = 81;
const NO_CAUSE = 255;
const PERSON = 0;

/** The board may send samples of its old state for this long after an order or an arming, ms. */
export const AGREE_ms = 500;

export function followBoard(state: State, out: Out): void {
  if ((state.status & STATUS.tripped) !== 0) boardTripped(state, out);
  else if ((state.status & (STATUS.armed | STATUS.emitting)) !== 0) boardLit(state, out);
  else boardDark(state, out);
}

function boardTripped(state: State, out: Out): void {
  if (state.state === STATE.tripped) return;
  // A latch without a cause is a latch all the same.
  const cause = state.boardCause === PERSON ? NO_CAUSE : state.boardCause;
  trip(state, out, cause, state.current_mA, state.case_degC);
}

function boardLit(state: State, out: Out): void {
  if (isLit(state)) {
    state.sawArmed = 1;
    takeLight(state, out);
    return;
  }
  // The board's answer to arming may come behind the first sample that shows it.
  if (state.arming === PENDING.waiting && (state.status & STATUS.emitting) === 0) return;
  if (state.state === STATE.tripped) {
    out.dark = state.cause;
    return;
  }
  // Dark was ordered: it is repeated with each sample until the board reports it.
  const ordered_ms = state.now_mono_ms - state.darkOrdered_mono_ms;
  if (ordered_ms < AGREE_ms) out.dark = state.darkOrdered;
  else trip(state, out, STATE_DIFFERS, state.status, state.state);
}

/** Armed and emitting are one session: which of the two is what the board says. */
function takeLight(state: State, out: Out): void {
  const emits = (state.status & STATUS.emitting) !== 0;
  if (emits && state.state === STATE.armed) {
    state.state = STATE.emitting;
    tell(out, EVENT.emitting, NO_HAZARD, state.asked_mA, state.case_degC);
  } else if (!emits && state.state === STATE.emitting) {
    state.state = STATE.armed;
    tell(out, EVENT.armed, NO_HAZARD, 0, state.case_degC);
  }
}

function boardDark(state: State, out: Out): void {
  if (isLit(state)) {
    const agreed = state.sawArmed === 1;
    const armed_ms = state.now_mono_ms - state.armed_mono_ms;
    if (!agreed && armed_ms < AGREE_ms) return;
    if (agreed && state.boardCause === ARMED_IDLE) {
      fallBack(state, out, ARMED_IDLE, state.current_mA, state.case_degC);
    } else trip(state, out, STATE_DIFFERS, state.status, state.state);
    return;
  }
  if (state.resetting === PENDING.waiting) clearLatch(state, out);
}

/** The board's latch is gone, so the host's may go: reset clears the board first. */
export function clearLatch(state: State, out: Out): void {
  if (state.resetting === PENDING.waiting) answer(out, state.resettingId, ANSWER.done, state.cause);
  state.resetting = PENDING.none;
  state.resettingUntil_mono_ms = Number.POSITIVE_INFINITY;
  state.state = STATE.standby;
  tell(out, EVENT.reset, state.cause, 0, 0);
}

/** Follows how long the drive has been at zero, dark, or held by the emission delay. */
export function takeDarkness(state: State): void {
  const dark = (state.status & STATUS.emitting) === 0 && state.set_mA === 0;
  if (!dark) state.darkSince_board_ms = Number.NaN;
  else if (Number.isNaN(state.darkSince_board_ms)) state.darkSince_board_ms = state.board_ms;

  const delayed = isLit(state) && (state.status & STATUS.delay) !== 0;
  const waits = isLit(state) && state.aim_mA === 0 && dark && !delayed;
  if (!waits) state.zeroSince_board_ms = Number.NaN;
  else if (Number.isNaN(state.zeroSince_board_ms)) state.zeroSince_board_ms = state.board_ms;

  if (!delayed) state.delaySince_board_ms = Number.NaN;
  else if (Number.isNaN(state.delaySince_board_ms)) state.delaySince_board_ms = state.board_ms;
}
