import type { SwitchRequest } from "../control/api.ts";
import { ANSWER, type Asker, REFUSALS, type RequestName, STATE, STATES } from "../judge/records.ts";
import { answerWords, refusalWords } from "../judge/words.ts";
import { causeById } from "../model/cause.ts";
import type { Mono_ms } from "../model/times.ts";
import type { Loop } from "./loop.ts";
import type { LoopAnswer } from "./ports.ts";

/** How long an arming or a reset may take from asking to the board's answer, ms. */
const EXCHANGE_ms_MAX = 4000;

interface Pending {
  readonly id: number;
  readonly name: RequestName;
  readonly until: number;
  answer(a: LoopAnswer): void;
}

/** Requests that change the bench. Everything else the switch knows is answered elsewhere. */
type Changing = Extract<SwitchRequest, { verb: "arm" | "set" | "dark" | "reset" }>;

/**
 * Brings people's requests to the judge and its answers back. An arming and a reset are exchanges
 * with the board: they are answered when the state shows how they ended.
 */
export class Asking {
  readonly #loop: Loop;
  #nextId = 1;
  #pending: Pending[] = [];

  constructor(loop: Loop) {
    this.#loop = loop;
  }

  ask(request: Changing, now: Mono_ms, answer: (a: LoopAnswer) => void): void {
    const value = this.#valueOf(request);
    if (value === null) {
      answer({
        ok: false,
        reason: "wrong-cause",
        words: `There is no cause "${(request as { cause: string }).cause}". beamsitter status names the one that stands.`,
      });
      return;
    }
    const id = this.#nextId++;
    this.#loop.request(request.verb, value, request.asker as Asker, id, now);
    const { out } = this.#loop;
    if (out.answerId === id && out.answer === ANSWER.begun) {
      this.#pending.push({ id, name: request.verb, until: now + EXCHANGE_ms_MAX, answer });
      return;
    }
    answer(this.#made(request.verb, out.answer === ANSWER.done, value));
  }

  /** Looks whether an exchange has ended; called after every step and at each deadline. */
  settle(now: Mono_ms): void {
    if (this.#pending.length === 0) return;
    this.#pending = this.#pending.filter((p) => !this.#ended(p, now));
  }

  #ended(p: Pending, now: Mono_ms): boolean {
    const { view, answerId, answer } = this.#loop.out;
    if (answerId === p.id && answer === ANSWER.refused) {
      p.answer(this.#made(p.name, false, 0));
      return true;
    }
    const reached =
      p.name === "arm"
        ? view.state === STATE.armed || view.state === STATE.emitting
        : view.state === STATE.standby;
    if (reached) {
      p.answer(this.#made(p.name, true, view.asked_mA));
      return true;
    }
    if (now < p.until) return false;
    p.answer({
      ok: false,
      reason: "no-answer",
      words: `The board did not carry out "${p.name}" within ${EXCHANGE_ms_MAX / 1000} s; the bench is ${STATES[view.state]}.`,
    });
    return true;
  }

  #valueOf(request: Changing): number | null {
    if (request.verb === "reset") return causeById(request.cause)?.code ?? null;
    return "current_mA" in request ? request.current_mA : 0;
  }

  #made(name: RequestName, ok: boolean, value: number): LoopAnswer {
    const { out, bench } = this.#loop;
    if (ok) return { ok, reason: "", words: answerWords(bench.name, name, value, out.view) };
    const refusal = REFUSALS[out.refusal] ?? "none";
    const words = refusalWords(refusal, value, out.answerValue, out.view);
    return refusal === "above-ceiling"
      ? { ok, reason: refusal, words, highest_mA: out.answerValue }
      : { ok, reason: refusal, words };
  }
}
