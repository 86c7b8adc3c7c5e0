import {
  CURVE_POINTS_MAX,
  CURVE_POINTS_MIN,
  type CurvePoints,
  curveCrc,
} from "../../firmware-protocol/answer.ts";
import { seal } from "../../firmware-protocol/line.ts";
import type { FieldsOf, Message } from "../../firmware-protocol/messages.ts";
import { reasonCode, reasonWords } from "../../firmware-protocol/reasons.ts";
import type { LinkQueue } from "./queue.ts";
import { Waiter } from "./waiter.ts";

/** Answer to a host line: 200 ms by contract, and as much again for the buffers on the way. */
export const ANSWER_ms = 500;
/** Whole loads tried before giving up; a lost answer costs one. */
export const CURVE_TRIES = 3;
/** Pause between two loads. */
const CURVE_PAUSE_ms = 1000;

/** What is wrong with a table before any of it is sent; null where nothing is. */
const faultOf = ({ x, y }: CurvePoints, absolute_counts: number): string | null => {
  const count = x.length;
  if (count !== y.length || count < CURVE_POINTS_MIN || count > CURVE_POINTS_MAX) {
    return `it has ${count} points; ${CURVE_POINTS_MIN} to ${CURVE_POINTS_MAX} are wanted`;
  }
  for (let i = 0; i < count; i += 1) {
    const px = x[i] ?? -1;
    const py = y[i] ?? -1;
    if (!Number.isInteger(px) || px < 0 || px > 65_535 || !Number.isInteger(py) || py < 0) {
      return `point ${i} (${px}, ${py}) is not made of whole counts from 0`;
    }
    if (py > absolute_counts) {
      return `point ${i} allows ${py} counts; the board's own ceiling is ${absolute_counts}`;
    }
    if (i > 0 && px <= (x[i - 1] ?? px)) return `point ${i} does not lie above the one before`;
  }
  return null;
};

type Step = "idle" | "stage" | "point" | "commit" | "readback" | "pause";

/**
 * Keeps the board's derating table the one this bench file makes: staged, committed by its checksum
 * and read back, and only in standby. Anything that goes wrong starts the whole load anew.
 */
export class CurveLoad {
  /** Checksum of the curve the board is known to hold; "" while that is not known. */
  held = "";
  private wanted: CurvePoints | null = null;
  private wantedCrc = "";
  private step: Step = "idle";
  private index = 0;
  private tries = 0;
  private due = false;
  private readonly waiter = new Waiter();
  private readonly queue: LinkQueue;

  constructor(queue: LinkQueue) {
    this.queue = queue;
  }

  /** Whether the board holds what is wanted. */
  get settled(): boolean {
    return this.wanted !== null && this.held === this.wantedCrc;
  }

  get loading(): boolean {
    return this.step !== "idle" || this.due;
  }

  clear(): void {
    this.wanted = null;
    this.wantedCrc = "";
    this.held = "";
    this.abandon();
  }

  /** Names the curve to be held from now on. It is loaded with the next sample in standby. */
  want(points: CurvePoints, absolute_counts: number): void {
    this.abandon();
    const fault = faultOf(points, absolute_counts);
    if (fault !== null) {
      this.wanted = null;
      this.queue.fact("curve-failed", -1, `the curve made for this board is unusable: ${fault}`);
      return;
    }
    this.wanted = points;
    this.wantedCrc = curveCrc(points);
    this.tries = 0;
    if (this.settled) this.queue.fact("curve-loaded", points.x.length, "the board held it already");
    else this.due = true;
  }

  /** A sample that says standby: loading may begin. */
  standby(): void {
    if (!this.due || this.step !== "idle" || this.wanted === null) return;
    this.due = false;
    this.tries += 1;
    this.index = 0;
    this.ask("stage", `>stage ${this.wanted.x.length}`);
  }

  read(message: Message): void {
    if (message.verb === "yes") this.accepted(message.fields);
    else if (message.verb === "curve") this.readBack(message.fields);
    else if (message.verb === "no" && message.fields.verb === this.step) {
      this.fail(message.fields.reason);
    }
  }

  elapse(now: number): void {
    if (!this.waiter.expired(now)) return;
    if (this.step === "pause") {
      this.abandon();
      this.due = true;
    } else this.fail("");
  }

  next(): number {
    return this.waiter.next();
  }

  private abandon(): void {
    this.step = "idle";
    this.due = false;
    this.waiter.end();
  }

  private ask(step: Step, body: string): void {
    this.step = step;
    this.waiter.begin(step, ANSWER_ms);
    this.queue.send(seal(body), "plain");
  }

  private accepted({ verb, value }: FieldsOf<"yes">): void {
    if (verb !== this.step || this.wanted === null) return;
    if (verb === "stage") this.sendPoint();
    else if (verb === "point" && value === this.index) {
      this.index += 1;
      if (this.index < this.wanted.x.length) this.sendPoint();
      else this.ask("commit", `>commit ${this.wantedCrc}`);
    } else if (verb === "commit") this.ask("readback", ">readback 0");
  }

  private sendPoint(): void {
    const i = this.index;
    this.ask("point", `>point ${i} ${this.wanted?.x[i] ?? 0} ${this.wanted?.y[i] ?? 0}`);
  }

  private readBack({ i, x, y, count, crc }: FieldsOf<"curve">): void {
    const { wanted } = this;
    if (this.step !== "readback" || wanted === null || i !== 0) return;
    const same = x === wanted.x[0] && y === wanted.y[0] && count === wanted.x.length;
    if (!same || crc !== this.wantedCrc) {
      this.fail("checksum");
      return;
    }
    this.held = crc;
    this.abandon();
    this.queue.fact("curve-loaded", count, "loaded and read back");
  }

  /** Tries the whole load again after a pause, or gives up. `reason` is empty for no answer. */
  private fail(reason: string): void {
    const at = this.step;
    if (this.tries < CURVE_TRIES) {
      this.step = "pause";
      this.waiter.begin("pause", CURVE_PAUSE_ms);
      return;
    }
    this.abandon();
    const why = reason === "" ? "the board did not answer" : reasonWords(reason);
    const code = reason === "" ? -1 : reasonCode(reason);
    this.queue.fact("curve-failed", code, `at "${at}", after ${this.tries} tries: ${why}`);
  }
}
