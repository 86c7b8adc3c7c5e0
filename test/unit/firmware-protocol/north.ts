import { readFileSync } from "node:fs";
import { assetFile } from "../../../daemon/paths.ts";
import { armAnswer, type CurvePoints, curveCrc } from "../../../firmware-protocol/answer.ts";
import { seal } from "../../../firmware-protocol/line.ts";
import { encodeArm, encodePermit } from "../../../firmware-protocol/permit.ts";
import {
  type ControllerOptions,
  NORTH_CHANNELS,
  newController,
  type SimController,
} from "../../../firmware-protocol/wasm/controller.ts";

export const wasmBytes = readFileSync(assetFile("firmware-protocol/wasm/controller.wasm"));
const module = new WebAssembly.Module(wasmBytes);

/** 25 degC on the built-in bench's case channel. */
export const CASE_25_degC = 8191;
const SUPPLY_5_V = 10_000;
const CURRENT_PER_SET = 25 / 8;
const PERIOD_TICKS = 20;

/** Flat at the board's absolute over all of the case's range. */
export const FLAT: CurvePoints = { x: [0, 16383], y: [4400, 4400] };

/** A controller with the plainest plant: what is commanded flows. One step is one tick. */
export class TestBench {
  readonly controller: SimController;
  readonly values = new Int32Array(NORTH_CHANNELS.length);
  readonly lines: string[] = [];
  tick: number;
  key = true;
  loop = true;
  session = "00000000";

  constructor(options: Partial<ControllerOptions> = {}, tick = 0) {
    this.tick = tick;
    this.values[2] = CASE_25_degC;
    this.values[8] = SUPPLY_5_V;
    this.controller = newController(module, { rate_perS: 50, jitter: 7, ...options });
    this.controller.boot("power", tick);
    this.run(600);
  }

  run(ticks: number): void {
    for (let i = 0; i < ticks; i += 1) this.step();
  }

  step(): void {
    const { controller, values } = this;
    this.tick = (this.tick + 1) >>> 0;
    const current_counts = Math.floor(controller.drive_counts * CURRENT_PER_SET);
    values[1] = current_counts;
    controller.inputs(this.key, this.loop, true, false);
    controller.conversion(current_counts, this.tick);
    if (this.tick % PERIOD_TICKS === 0) controller.reading(values, this.tick);
    controller.pass(this.tick);
    this.#keep();
  }

  /** Sends a line and returns what came back within a few ticks, samples apart. */
  say(line: string): readonly string[] {
    const before = this.lines.length;
    this.controller.receive(Buffer.from(`${line}\n`, "latin1"));
    this.run(3);
    return this.lines.slice(before).filter((text) => !text.startsWith("<sample"));
  }

  /** The newest sample's fields after the verb. */
  sample(): readonly string[] {
    const line = this.lines.findLast((text) => text.startsWith("<sample"));
    return (line ?? "").split(" ").slice(1, -1);
  }

  loadCurve(points: CurvePoints = FLAT): void {
    this.say(seal(`>stage ${points.x.length}`));
    points.x.forEach((x, i) => {
      this.say(seal(`>point ${i} ${x} ${points.y[i]}`));
    });
    this.say(seal(`>commit ${curveCrc(points)}`));
  }

  /** Curve, ask, answer; false where the board refuses. */
  arm(): boolean {
    this.loadCurve();
    const offer = (this.say(seal(">ask arm"))[0] ?? "").split(" ");
    if (offer[0] !== "<offer") return false;
    const answer = armAnswer({
      number: offer[2] ?? "",
      boot: Number(offer[3]),
      arms: Number(offer[4]),
      curveCrc: curveCrc(FLAT),
      absolute_counts: 4400,
      term_ticks_min: 150,
      term_ticks_max: 10_000,
      protocol: 1,
      firmware: "bs-north-1",
    });
    const yes = (this.say(encodeArm(answer))[0] ?? "").split(" ");
    this.session = yes[2] ?? "00000000";
    return yes[0] === "<yes";
  }

  permit(cap: number, aim: number, term: number): void {
    const n = Number(this.sample()[0]);
    this.controller.receive(
      Buffer.from(`${encodePermit(this.session, n, cap, aim, term)}\n`, "latin1"),
    );
  }

  /** Runs with a permit every 100 ticks. */
  hold(ticks: number, cap: number, aim: number, term = 500): void {
    for (let i = 0; i < ticks; i += 100) {
      this.permit(cap, aim, term);
      this.run(100);
    }
  }

  #keep(): void {
    const bytes = this.controller.sent();
    if (bytes.length === 0) return;
    const text = Buffer.from(bytes).toString("latin1");
    this.lines.push(...text.split("\n").slice(0, -1));
  }
}
