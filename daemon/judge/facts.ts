import { linkFactCode } from "../model/link-fact.ts";
import { release } from "./cap.ts";
import { goDark, isLit, trip } from "./cut.ts";
import { forgetForecast } from "./forecast.ts";
import { ANSWER, type Input, NO_HAZARD, type Out, STATE, WATCH } from "./records.ts";
import { clearRows, PENDING, type State } from "./state.ts";
import { answer, EVENT, REFUSED, refuse, tell } from "./tell.ts";

/** What the link reports beside samples: the port, introductions, and the answers of the board. */

const PORT_CLOSED = linkFactCode("port-closed");
const INTRODUCED = linkFactCode("introduced");
const WRONG_VERSION = linkFactCode("wrong-version");
const NOT_INTRODUCED = linkFactCode("not-introduced");
const BOARD_CHANGED = linkFactCode("board-changed");
const BOARD_RESET = linkFactCode("board-reset");
const ARMED = linkFactCode("armed");
const ARM_REFUSED = linkFactCode("arm-refused");
const RESET_REFUSED = linkFactCode("reset-refused");
const NO_ANSWER = linkFactCode("no-answer");

const CONTROLLER_RESET = 73;
const BOARD_CHANGED_CAUSE = 82;
const LINK_LOST = 83;
const CUT_AT_OPEN = 88;
const PERSON = 0;

export function takeFact(state: State, input: Input, out: Out): void {
  switch (input.fact) {
    case INTRODUCED:
      connect(state, input, out);
      break;
    case PORT_CLOSED:
    case WRONG_VERSION:
    case NOT_INTRODUCED:
      if (isLit(state)) trip(state, out, LINK_LOST, 1, 1);
      disconnect(state, out);
      break;
    case BOARD_RESET:
      if (isLit(state)) trip(state, out, CONTROLLER_RESET, input.factValue, 1);
      disconnect(state, out);
      break;
    case BOARD_CHANGED:
      trip(state, out, BOARD_CHANGED_CAUSE, input.factValue, 0);
      break;
    case ARMED:
      armed(state, input, out);
      break;
    case ARM_REFUSED:
      endArming(state, out, REFUSED.board, input.factValue);
      break;
    case RESET_REFUSED:
      endResetting(state, out, REFUSED.board, input.factValue);
      break;
    case NO_ANSWER:
      endArming(state, out, REFUSED["no-answer"], input.factValue);
      endResetting(state, out, REFUSED["no-answer"], input.factValue);
      break;
    default:
      // The others are for people and the record; samples tell the judge what they mean.
      break;
  }
}

/** A controller introduced itself. Only a bench that was dark and not latched becomes standby. */
function connect(state: State, input: Input, out: Out): void {
  if (isLit(state)) trip(state, out, CONTROLLER_RESET, input.factValue, 1);
  state.connected = 1;
  forgetSamples(state);
  if (state.state === STATE.offline) state.state = STATE.standby;
  tell(out, EVENT.connected, NO_HAZARD, input.factValue, 0);
  // The line was asserted, or its one-shot unfed, from the port's opening on.
  if (state.watch === WATCH.line || state.watch === WATCH.toggled) {
    trip(state, out, CUT_AT_OPEN, Number.NaN, Number.NaN);
  } else if (state.watch === WATCH.text && state.state === STATE.tripped) {
    // Whether the text was ever heard is not known: it is sent again.
    trip(state, out, state.cause, Number.NaN, Number.NaN);
  }
}

function disconnect(state: State, out: Out): void {
  if (state.connected === 1) tell(out, EVENT.disconnected, NO_HAZARD, state.current_mA, 0);
  state.connected = 0;
  if (state.state === STATE.standby || state.watch === WATCH.only) state.state = STATE.offline;
  forgetSamples(state);
  endArming(state, out, REFUSED.offline, Number.NaN);
  endResetting(state, out, REFUSED.offline, Number.NaN);
}

/** Old samples say nothing of a controller that was away: its numbers may begin anew. */
function forgetSamples(state: State): void {
  state.sampled = 0;
  state.status = 0;
  state.gapWarned = 0;
  state.windowCount = 0;
  state.medianCount = 0;
  state.darkSince_board_ms = Number.NaN;
  clearRows(state);
  forgetForecast(state);
}

/** The board opened a session. Permits begin with the next sample that shows it armed. */
function armed(state: State, input: Input, out: Out): void {
  if (state.arming !== PENDING.waiting || state.state !== STATE.standby) {
    // Nobody waits for this any more: the session is closed again.
    if (!isLit(state)) goDark(state, out, state.state === STATE.tripped ? state.cause : PERSON);
    endArming(state, out, REFUSED["went-dark"], Number.NaN);
    return;
  }
  state.arming = PENDING.none;
  state.armingUntil_mono_ms = Number.POSITIVE_INFINITY;
  state.state = STATE.armed;
  state.sawArmed = 0;
  state.permits = 0;
  state.aim_mA = 0;
  state.asked_mA = state.arming_mA;
  state.armed_mono_ms = input.now_ms;
  release(state);
  answer(out, state.armingId, ANSWER.done, state.asked_mA);
  tell(out, EVENT.armed, NO_HAZARD, state.asked_mA, state.case_degC);
}

export function endArming(state: State, out: Out, refusal: number, value: number): void {
  if (state.arming === PENDING.none) return;
  const wanted = state.arming === PENDING.waiting;
  state.arming = PENDING.none;
  state.armingUntil_mono_ms = Number.POSITIVE_INFINITY;
  refuse(out, state.armingId, wanted ? refusal : REFUSED["went-dark"], value);
}

export function endResetting(state: State, out: Out, refusal: number, value: number): void {
  if (state.resetting === PENDING.none) return;
  state.resetting = PENDING.none;
  state.resettingUntil_mono_ms = Number.POSITIVE_INFINITY;
  refuse(out, state.resettingId, refusal, value);
}
