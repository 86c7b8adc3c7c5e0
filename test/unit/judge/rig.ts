import type { Plan } from "../../../daemon/judge/plan.ts";
import {
  ASKERS,
  type Asker,
  INPUT,
  type Input,
  ORDER,
  type Out,
  REFUSALS,
  REQUESTS,
  type RequestName,
  STATES,
} from "../../../daemon/judge/records.ts";
import { newInput, newOut, newState, type State } from "../../../daemon/judge/state.ts";
import { step } from "../../../daemon/judge/step.ts";
import { EVENT_KINDS } from "../../../daemon/model/event.ts";
import { type LinkFact, linkFactCode } from "../../../daemon/model/link-fact.ts";
import { STATUS } from "../../../daemon/model/sample.ts";
import { CHANNEL, planOf } from "./bench.ts";

export interface Told {
  readonly kind: string;
  readonly hazard: number;
  readonly a: number;
  readonly b: number;
  readonly at_ms: number;
}

const PERIOD_ms = 20;
const DELAY_ms = 4000;

/**
 * A judge on a bench of plain numbers: a board that obeys, whose readings a test sets at will. It
 * is no copy of the controller's logic: it does what it is told at once, and judges nothing.
 */
export class Rig {
  readonly plan: Plan;
  readonly state: State;
  readonly out: Out = newOut();
  readonly told: Told[] = [];
  /** Every permit: the counts and the tick. */
  readonly permits: { seq: number; cap: number; aim: number; term: number; at_ms: number }[] = [];
  readonly darks: number[] = [];
  readonly answers: { id: number; answer: number; refusal: string; value: number }[] = [];
  readonly input: Input = newInput();
  now_ms = 1000;
  /** What the board is and does. */
  board = { armed: false, tripped: false, cause: 0, aim: 0, delayUntil_ms: 0, obeys: true };
  key = true;
  loop = true;
  curve = true;
  hand = false;
  anchor = true;
  lockout = false;
  injected = false;
  case_counts = 2500;
  /** Measured current is the drive plus this, counts; NaN: not tied to the drive. */
  currentOff_counts = 0;
  /** Light per what the diode should give. */
  output = 1;
  photodiode_counts = Number.NaN;
  current_counts = Number.NaN;
  drift = 0;
  jump_ms = 0;
  newest = 1;
  portDrained = 1;
  nextId = 1;

  constructor(plan: Plan = planOf(), state: State = newState()) {
    this.plan = plan;
    this.state = state;
  }

  get stateName(): string {
    return STATES[this.state.state] ?? "?";
  }

  fact(fact: LinkFact, value = 0): void {
    this.#begin(INPUT.link);
    this.input.fact = linkFactCode(fact);
    this.input.factValue = value;
    this.#step();
  }

  request(name: RequestName, value = 0, asker: Asker = "person"): string {
    this.#begin(INPUT.request);
    this.input.request = REQUESTS.indexOf(name);
    this.input.asker = ASKERS.indexOf(asker);
    this.input.requestId = this.nextId++;
    this.input.value = value;
    this.#step();
    return REFUSALS[this.out.refusal] ?? "?";
  }

  /** Lets time pass to the judge's next deadline, without a sample. */
  deadline(): void {
    this.now_ms = this.out.deadline_ms;
    this.elapse();
  }

  elapse(): void {
    this.#begin(INPUT.deadline);
    this.#step();
  }

  /** One sample period, or several. */
  sample(times = 1): void {
    for (let i = 0; i < times; i++) {
      this.now_ms += PERIOD_ms;
      this.input.sample.seq++;
      this.input.sample.tick += PERIOD_ms;
      this.input.sample.conversions = (this.input.sample.conversions + 1) & 0xffff;
      this.again();
    }
  }

  /** The same sample once more, as the board is now. */
  again(): void {
    const { sample } = this.input;
    this.#begin(INPUT.sample);
    sample.status = this.#status();
    sample.cause = this.board.cause;
    const drive = this.drive;
    sample.values[CHANNEL.set] = drive;
    const flows = Number.isNaN(this.current_counts)
      ? Math.max(0, drive === 0 ? 0 : drive + this.currentOff_counts)
      : this.current_counts;
    sample.values[CHANNEL.current] = flows;
    sample.values[CHANNEL.case] = this.case_counts;
    const light = Math.max(0, flows * 0.5 - 400) * this.output;
    sample.values[CHANNEL.photodiode] = Number.isNaN(this.photodiode_counts)
      ? Math.round(light * 10)
      : this.photodiode_counts;
    this.#step();
  }

  /** What the board drives: its aim, held at zero during the emission delay. */
  get drive(): number {
    return this.board.armed && !this.delayed ? this.board.aim : 0;
  }

  get delayed(): boolean {
    return this.board.armed && this.now_ms < this.board.delayUntil_ms;
  }

  connect(): this {
    this.fact("introduced");
    this.sample(10);
    return this;
  }

  /** Armed, delay over, and up at what was asked. */
  light(current_mA: number): this {
    this.connect();
    this.arm(current_mA);
    this.sample(400);
    return this;
  }

  arm(current_mA: number, asker: Asker = "person"): string {
    const refusal = this.request("arm", current_mA, asker);
    if (this.out.order === ORDER.arm) {
      this.board = { ...this.board, armed: true, aim: 0, delayUntil_ms: this.now_ms + DELAY_ms };
      this.fact("armed");
    }
    return refusal;
  }

  events(kind: string): Told[] {
    return this.told.filter((event) => event.kind === kind);
  }

  trips(): number[] {
    return this.events("trip").map((event) => event.hazard);
  }

  #status(): number {
    const bits = STATUS;
    const { armed, tripped } = this.board;
    let status = 0;
    if (armed) status |= bits.armed;
    if (this.drive > 0) status |= bits.emitting;
    if (tripped) status |= bits.tripped;
    if (this.key) status |= bits.key;
    if (this.loop) status |= bits.loop;
    if (this.curve) status |= bits.curve;
    if (this.hand) status |= bits.hand;
    if (this.anchor) status |= bits.anchor;
    if (this.lockout) status |= bits.lockout;
    if (this.injected) status |= bits.injected;
    if (this.delayed) status |= bits.delay;
    return status;
  }

  #begin(kind: number): void {
    const { input } = this;
    input.n++;
    input.kind = kind;
    input.now_ms = this.now_ms;
    input.drift = this.drift;
    input.jump_ms = this.jump_ms;
    input.newest = this.newest;
    input.portDrained = this.portDrained;
    input.request = 0;
    input.asker = 0;
    input.requestId = 0;
    input.value = 0;
    input.fact = 0;
    input.factValue = 0;
  }

  #step(): void {
    const { out } = this;
    step(this.plan, this.state, this.input, out);
    for (let i = 0; i < out.eventCount; i++) {
      this.told.push({
        kind: EVENT_KINDS[out.eventKind[i] ?? -1] ?? "?",
        hazard: out.eventHazard[i] ?? 0,
        a: out.eventA[i] ?? 0,
        b: out.eventB[i] ?? 0,
        at_ms: this.now_ms,
      });
    }
    if (out.answer !== 0) {
      const refusal = REFUSALS[out.refusal] ?? "?";
      this.answers.push({ id: out.answerId, answer: out.answer, refusal, value: out.answerValue });
    }
    this.#obey();
  }

  #obey(): void {
    const { out, board } = this;
    if (out.dark >= 0) {
      this.darks.push(out.dark);
      if (board.obeys && board.armed) {
        board.armed = false;
        board.aim = 0;
        board.cause = out.dark;
        if (out.dark > 0) board.tripped = true;
      }
    } else if (out.permit === 1) {
      this.permits.push({
        seq: out.permitSeq,
        cap: out.cap_counts,
        aim: out.aim_counts,
        term: out.term_ticks,
        at_ms: this.now_ms,
      });
      if (board.obeys && board.armed) board.aim = out.aim_counts;
    }
    if (out.order === ORDER.reset && board.obeys && out.orderValue === board.cause) {
      board.tripped = false;
    }
  }
}
