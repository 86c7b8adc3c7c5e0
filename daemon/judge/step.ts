import { STATUS } from "../model/sample.ts";
import { judgeTrips, judgeWarnings, measureRows } from "./alarm.ts";
import { followBoard, takeDarkness } from "./board.ts";
import { takeCap } from "./cap.ts";
import { showCorridor, takeCorridor, takeWindow } from "./corridor.ts";
import { isLit, trip } from "./cut.ts";
import { endGap, nextDeadline, watchDeadlines } from "./deadlines.ts";
import { takeFact } from "./facts.ts";
import { takeForecast } from "./forecast.ts";
import { grantPermit } from "./permit.ts";
import type { Plan } from "./plan.ts";
import { takeClock, takeMedian, takeReadings } from "./reading.ts";
import { ANSWER, FLAG, INPUT, type Input, ORDER, type Out, STATE, WATCH } from "./records.ts";
import { answerRequest } from "./requests.ts";
import type { State } from "./state.ts";
import { EVENT, tell } from "./tell.ts";
import { judgeWatched } from "./watch.ts";

/**
 * The supervising step: one input judged, one outcome. It reads no clock, does no I/O and allocates
 * nothing; the same plan, state and input give the same outcome, live or from a recording.
 *
 * A sample is judged in `judgeSample`. Light is cut in `cut.ts`, and nowhere else. A permit, the
 * only thing that can raise current, is made in `permit.ts`, last, and only for this sample.
 *
 * @param plan the compiled bench; null until a controller has introduced itself
 * @param state what the judge remembers; changed in place
 * @param out refilled; the caller carries out `dark` first, then `permit`, then `order`
 * @throws JudgeDefect where an invariant does not hold: the caller then sends dark with cause 87
 */
export function step(plan: Plan | null, state: State, input: Input, out: Out): void {
  clearOut(out);
  state.now_mono_ms = input.now_ms;
  if (plan !== null) state.watch = plan.watch;
  if (state.untold === 1) tellRestored(state, out);
  if (input.kind === INPUT.sample) {
    if (plan !== null && state.connected === 1) judgeSample(plan, state, input, out);
  } else if (input.kind === INPUT.request) answerRequest(plan, state, input, out);
  else if (input.kind === INPUT.link) takeFact(state, input, out);
  watchDeadlines(plan, state, out);
  show(state, out);
  out.deadline_ms = nextDeadline(plan, state);
}

const TICK_DRIFT = 72;
/** Emission delay of the board, ms; fixed in the protocol. */
const EMISSION_DELAY_ms = 4000;

/** One sample: taken, compared with the board's state, placed in the corridor, judged, permitted. */
function judgeSample(plan: Plan, state: State, input: Input, out: Out): void {
  const gap_ms = input.now_ms - state.sampled_mono_ms;
  if (!takeClock(plan, state, input)) return;
  endGap(plan, state, out, gap_ms);
  takeReadings(plan, state, input);
  takeCorridor(plan, state);
  takeMedian(state);
  takeWindow(plan, state);
  if (plan.watch !== WATCH.none) {
    judgeWatched(plan, state, input, out);
    return;
  }

  followBoard(state, out);
  takeDarkness(state);
  measureRows(plan, state);
  if (state.tickJumped === 1 && isLit(state)) trip(state, out, TICK_DRIFT, input.jump_ms, 0);
  judgeTrips(plan, state, out);
  judgeWarnings(plan, state, out);

  takeForecast(plan, state);
  if (!isLit(state)) return;
  takeCap(plan, state, out);
  grantPermit(plan, state, input, out);
}

/** A daemon that had stopped while armed finds that out at start; the trip is told with its first step. */
function tellRestored(state: State, out: Out): void {
  state.untold = 0;
  tell(out, EVENT.trip, state.cause, Number.NaN, Number.NaN);
}

function clearOut(out: Out): void {
  out.dark = -1;
  out.permit = 0;
  out.permitSeq = 0;
  out.cap_counts = 0;
  out.aim_counts = 0;
  out.term_ticks = 0;
  out.order = ORDER.none;
  out.orderValue = 0;
  out.answer = ANSWER.none;
  out.answerId = 0;
  out.refusal = 0;
  out.answerValue = Number.NaN;
  out.eventCount = 0;
}

/** Where everything stands now. */
function show(state: State, out: Out): void {
  const { view } = out;
  const lit = isLit(state);
  view.state = state.state;
  view.flags = flagsOf(state);
  view.cause = state.cause;
  const asks = lit && state.watch === WATCH.none;
  view.asked_mA = asks ? state.asked_mA : Number.NaN;
  view.aim_mA = asks ? state.aim_mA : Number.NaN;
  view.current_mA = state.current_mA;
  view.case_degC = state.case_degC;
  view.output_mW = state.output_mW;
  showCorridor(state, out);
  view.caseSlope_KperS = state.caseSlope_KperS;
  view.timeToCap_s = lit ? state.timeToCap_s : Number.NaN;
  const left_ms = state.delaySince_board_ms + EMISSION_DELAY_ms - state.board_ms;
  view.delayLeft_ms = Number.isNaN(left_ms) ? 0 : Math.max(0, left_ms);
  view.loopDelay_ms = state.loopDelay_ms;
  view.loopDelayWorst_ms = state.loopDelayWorst_ms;
}

function flagsOf(state: State): number {
  const held = state.capped === 1 && isLit(state) ? FLAG.capped : 0;
  const delay = isLit(state) && (state.status & STATUS.delay) !== 0 ? FLAG.delay : 0;
  const unheard = state.state === STATE.tripped && state.connected === 0 ? FLAG.unheard : 0;
  return held | delay | unheard | watchFlag(state);
}

function watchFlag(state: State): number {
  if (state.watch === WATCH.none) return 0;
  return state.watch === WATCH.only ? FLAG.watchOnly : FLAG.cutOff;
}
