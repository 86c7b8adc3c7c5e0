import { causeOf } from "../model/cause.ts";
import { type Out, STATE, WATCH } from "./records.ts";
import type { State } from "./state.ts";
import { EVENT, tell } from "./tell.ts";

/**
 * The one place where light is cut. Every trip and every ordered dark of the host goes through
 * `order`: the caller carries `out.dark` out before anything else.
 */

const PERSON = 0;
const CUT_BY_PERSON = 89;

/** Whether a session is open: the bench is armed or emits. */
export const isLit = (state: State): boolean =>
  state.state === STATE.armed || state.state === STATE.emitting;

/** Orders dark in this step and takes back whatever this step had granted. */
function order(state: State, out: Out, cause: number): void {
  out.dark = cause;
  out.permit = 0;
  state.darkOrdered = cause;
  state.darkOrdered_mono_ms = state.now_mono_ms;
}

/** Forgets the session: what was asked, how far the cap let it, and what the permits aimed at. */
function endSession(state: State): void {
  state.asked_mA = 0;
  state.aim_mA = 0;
  state.capped = 0;
  state.allowed_mA = Number.POSITIVE_INFINITY;
  state.cappedAt_degC = Number.NaN;
  state.coolSince_board_ms = Number.NaN;
  state.sawArmed = 0;
  state.permits = 0;
  state.zeroSince_board_ms = Number.NaN;
  state.delaySince_board_ms = Number.NaN;
}

/**
 * Cuts light and latches. The first cause stays while tripped: a second trip orders dark again and
 * changes nothing else.
 * @param a,b the numbers that tripped: what was measured, and the level
 */
export function trip(state: State, out: Out, cause: number, a: number, b: number): void {
  // Nothing here can cut, and "tripped" would be a lie; what was passed is told in watch.ts.
  if (state.watch === WATCH.only) return;
  order(state, out, cause);
  if (state.state === STATE.tripped) return;
  state.state = STATE.tripped;
  state.cause = cause;
  endSession(state);
  tell(out, EVENT.trip, cause, a, b);
}

/**
 * Cuts light because a person, or the daemon's own end, asks for it. A cause that latches is a trip
 * where light was on; while tripped the bench stays tripped.
 */
export function goDark(state: State, out: Out, cause: number): void {
  if (state.watch !== WATCH.none) {
    // A cut-off holds until somebody lets it go, so every use of it latches.
    trip(state, out, cause === PERSON ? CUT_BY_PERSON : cause, state.current_mA, state.case_degC);
    return;
  }
  const wasLit = isLit(state);
  if (wasLit && causeOf(cause).latches) {
    trip(state, out, cause, state.current_mA, state.case_degC);
    return;
  }
  order(state, out, wasLit || state.state === STATE.tripped ? cause : PERSON);
  if (!wasLit) return;
  const { current_mA, case_degC } = state;
  fallBack(state, out, cause, current_mA, case_degC);
}

/** The session ended without a latch: a person's dark, or the board's fall-back when left idle. */
export function fallBack(state: State, out: Out, cause: number, a: number, b: number): void {
  state.state = STATE.standby;
  state.cause = cause;
  endSession(state);
  tell(out, EVENT.dark, cause, a, b);
}
