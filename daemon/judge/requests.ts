import { STATUS } from "../model/sample.ts";
import { clearLatch } from "./board.ts";
import { release } from "./cap.ts";
import { goDark, isLit } from "./cut.ts";
import { rowOf } from "./hazards.ts";
import type { Plan } from "./plan.ts";
import {
  ANSWER,
  ASKERS,
  type Input,
  NO_HAZARD,
  ORDER,
  type Out,
  REQUEST,
  STATE,
  WATCH,
} from "./records.ts";
import { PENDING, type State } from "./state.ts";
import { answer, EVENT, REFUSED, refuse, tell } from "./tell.ts";

/** What people and programs ask for: arm, set, dark, reset, stop. Every request gets an answer. */

const AWAY = ASKERS.indexOf("away");
const SCRIPTED = ASKERS.indexOf("scripted-person");
const PERSON = 0;

/** The link gives an exchange up before this; beyond it the judge does so itself, ms. */
export const EXCHANGE_ms = 3000;

const CASE_OVER = rowOf("case-over");
const SENSOR_ROWS = [rowOf("case-open"), rowOf("case-short"), rowOf("sensor-range")];

export function answerRequest(plan: Plan | null, state: State, input: Input, out: Out): void {
  switch (input.request) {
    case REQUEST.dark:
      askDark(state, input, out, PERSON);
      break;
    case REQUEST.stop:
      askDark(state, input, out, input.value);
      break;
    case REQUEST.arm:
      askArm(plan, state, input, out);
      break;
    case REQUEST.set:
      askSet(plan, state, input, out);
      break;
    case REQUEST.reset:
      askReset(plan, state, input, out);
      break;
    default:
      refuse(out, input.requestId, REFUSED.board, input.request);
  }
}

/** Dark is never refused, but where nothing can cut: a "done" would then be a lie. */
function askDark(state: State, input: Input, out: Out, cause: number): void {
  if (state.watch === WATCH.only) {
    if (input.request === REQUEST.stop) answer(out, input.requestId, ANSWER.done, 0);
    else refuse(out, input.requestId, REFUSED["watch-only"], Number.NaN);
    return;
  }
  if (state.arming === PENDING.waiting) state.arming = PENDING.cancelled;
  goDark(state, out, cause);
  answer(out, input.requestId, ANSWER.done, 0);
}

function askArm(plan: Plan | null, state: State, input: Input, out: Out): void {
  const refusal = whyNotArm(plan, state, input);
  if (refusal !== REFUSED.none) {
    refuse(out, input.requestId, refusal, helpful(state, refusal));
    return;
  }
  state.arming = PENDING.waiting;
  state.armingId = input.requestId;
  state.arming_mA = input.value;
  state.armingUntil_mono_ms = input.now_ms + EXCHANGE_ms;
  out.order = ORDER.arm;
  answer(out, input.requestId, ANSWER.begun, input.value);
}

/** The first reason against arming, in the order in which a person would mend them. */
function whyNotArm(plan: Plan | null, state: State, input: Input): number {
  if (state.watch !== WATCH.none) return REFUSED["watch-only"];
  if (input.asker === SCRIPTED && plan?.builtIn !== true) return REFUSED["not-built-in"];
  if (state.state === STATE.tripped) return REFUSED.tripped;
  if (plan === null || state.connected === 0 || state.sampled === 0) return REFUSED.offline;
  if (input.now_ms - state.sampled_mono_ms > plan.term_ms) return REFUSED.offline;
  if (state.arming !== PENDING.none || state.resetting !== PENDING.none) return REFUSED.busy;
  if (state.state !== STATE.standby) return REFUSED["not-standby"];
  const { status } = state;
  if ((status & STATUS.lockout) !== 0) return REFUSED.lockout;
  if ((status & STATUS.key) === 0) return REFUSED["key-off"];
  if ((status & STATUS.loop) === 0) return REFUSED["loop-open"];
  if ((status & STATUS.curve) === 0) return REFUSED["no-curve"];
  if (isSensorBad(plan, state)) return REFUSED.sensor;
  if (state.caseMedian_degC >= (plan.trip[CASE_OVER] as number)) return REFUSED["case-warm"];
  if (input.asker === AWAY && (status & STATUS.hand) === 0) return REFUSED["needs-hand"];
  return whyNotCurrent(state, input.value);
}

function whyNotCurrent(state: State, current_mA: number): number {
  if (!(current_mA >= 0)) return REFUSED["below-zero"];
  return current_mA <= state.ceiling_mA ? REFUSED.none : REFUSED["above-ceiling"];
}

function isSensorBad(plan: Plan, state: State): boolean {
  if (!Number.isFinite(state.case_degC)) return true;
  const [open, short, range] = SENSOR_ROWS as [number, number, number];
  if ((state.tripValue[open] as number) >= (plan.trip[open] as number)) return true;
  if ((state.tripValue[short] as number) <= (plan.trip[short] as number)) return true;
  return (state.tripValue[range] as number) >= (plan.trip[range] as number);
}

/** The number that helps beside a refusal. */
function helpful(state: State, refusal: number): number {
  if (refusal === REFUSED["above-ceiling"]) return state.ceiling_mA;
  if (refusal === REFUSED.tripped || refusal === REFUSED["wrong-cause"]) return state.cause;
  return refusal === REFUSED["case-warm"] ? state.case_degC : Number.NaN;
}

function askSet(plan: Plan | null, state: State, input: Input, out: Out): void {
  const refusal = whyNotSet(plan, state, input);
  if (refusal !== REFUSED.none) {
    refuse(out, input.requestId, refusal, helpful(state, refusal));
    return;
  }
  tell(out, EVENT.set, NO_HAZARD, input.value, state.asked_mA);
  state.asked_mA = input.value;
  // What is asked fits under the ceiling of now, so nothing is held down any more.
  release(state);
  answer(out, input.requestId, ANSWER.done, input.value);
}

function whyNotSet(plan: Plan | null, state: State, input: Input): number {
  if (state.watch !== WATCH.none) return REFUSED["watch-only"];
  if (input.asker === SCRIPTED && plan?.builtIn !== true) return REFUSED["not-built-in"];
  if (state.state === STATE.tripped) return REFUSED.tripped;
  if (state.state === STATE.offline) return REFUSED.offline;
  if (!isLit(state)) return REFUSED["not-armed"];
  return whyNotCurrent(state, input.value);
}

/** Reset clears the board's latch first; the host's own goes when a sample shows that it is gone. */
function askReset(plan: Plan | null, state: State, input: Input, out: Out): void {
  const refusal = whyNotReset(plan, state, input);
  if (refusal !== REFUSED.none) {
    refuse(out, input.requestId, refusal, helpful(state, refusal));
    return;
  }
  state.resetting = PENDING.waiting;
  state.resettingId = input.requestId;
  state.resettingUntil_mono_ms = input.now_ms + EXCHANGE_ms;
  if ((state.status & STATUS.tripped) === 0) {
    if (state.watch !== WATCH.none) {
      // The cut-off is let go together with the latch.
      out.order = ORDER.reset;
      out.orderValue = state.cause;
    }
    clearLatch(state, out);
    return;
  }
  out.order = ORDER.reset;
  // The board latched a cause of its own where it acted first; it must be given its own name.
  out.orderValue = state.boardCause;
  answer(out, input.requestId, ANSWER.begun, state.cause);
}

function whyNotReset(plan: Plan | null, state: State, input: Input): number {
  if (input.asker === SCRIPTED && plan?.builtIn !== true) return REFUSED["not-built-in"];
  if (state.state !== STATE.tripped) return REFUSED["not-tripped"];
  if (input.value !== state.cause) return REFUSED["wrong-cause"];
  if (state.connected === 0 || state.sampled === 0) return REFUSED.offline;
  if (state.resetting !== PENDING.none) return REFUSED.busy;
  const { status } = state;
  // The board has not gone dark yet, so its latch is not there to be cleared.
  if ((status & (STATUS.armed | STATUS.emitting)) !== 0) return REFUSED.busy;
  if ((status & STATUS.key) === 0) return REFUSED["key-off"];
  return (status & STATUS.loop) === 0 ? REFUSED["loop-open"] : REFUSED.none;
}
