import { EVENT_KINDS, type EventKind } from "../model/event.ts";
import { assert } from "./assert.ts";
import {
  ANSWER,
  EVENTS_PER_STEP_MAX,
  NO_HAZARD,
  type Out,
  REFUSALS,
  type Refusal,
} from "./records.ts";

/** Codes of event kinds by name, so that a step compares and writes numbers only. */
export const EVENT = Object.fromEntries(EVENT_KINDS.map((kind, i) => [kind, i])) as Readonly<
  Record<EventKind, number>
>;

/** Codes of refusals by name. */
export const REFUSED = Object.fromEntries(REFUSALS.map((name, i) => [name, i])) as Readonly<
  Record<Refusal, number>
>;

/** Adds one event to the outcome; `hazard` is a cause code, a warning row, or NO_HAZARD. */
export function tell(out: Out, kind: number, hazard: number, a: number, b: number): void {
  assert(out.eventCount < EVENTS_PER_STEP_MAX, "a step has room for its events");
  const i = out.eventCount++;
  out.eventKind[i] = kind;
  out.eventHazard[i] = hazard;
  out.eventA[i] = a;
  out.eventB[i] = b;
}

/** Answers a request that is done, or begun and answered later. */
export function answer(out: Out, id: number, code: number, value: number): void {
  out.answer = code;
  out.answerId = id;
  out.answerValue = value;
}

/**
 * Refuses a request with its reason, and tells of it.
 * @param value what helps: the highest current allowed (mA), the cause that stands, or a code
 */
export function refuse(out: Out, id: number, refusal: number, value: number): void {
  answer(out, id, ANSWER.refused, value);
  out.refusal = refusal;
  tell(out, EVENT.refused, NO_HAZARD, refusal, value);
}
