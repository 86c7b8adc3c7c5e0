import { armAnswer, type CurvePoints, curveCrc } from "../../firmware-protocol/answer.ts";
import { LINE_BYTES_MAX, seal } from "../../firmware-protocol/line.ts";
import {
  type FieldsOf,
  type Message,
  readLine,
  type Verb,
} from "../../firmware-protocol/messages.ts";
import { encodeArm, encodePermit } from "../../firmware-protocol/permit.ts";
import { World } from "./world.ts";

/** Status bits of a sample, as PROTOCOL.md numbers them. */
export const EMITTING = 1 << 0;
export const ARMED = 1 << 1;
export const TRIPPED = 1 << 2;
export const LIMITED = 1 << 6;
export const INDICATOR = 1 << 12;

export type Sample = FieldsOf<"sample">;
type Hello = Extract<FieldsOf<"hello">, { firmware: string }>;

/** Counts of `case` at a temperature: the divider of the board's README, 16384 counts full scale. */
export const caseCounts = (degC: number): number => {
  const ntc_ohm = 10_000 * Math.exp(3950 * (1 / (degC + 273.15) - 1 / 298.15));
  const lower_ohm = 1 / (1 / ntc_ohm + 1 / 1e6);
  return Math.round((16_384 * lower_ohm) / (lower_ohm + 10_000));
};

/** Derating used here: 1.9 A up to 25 °C, 1.6 A at 40 °C, 1.0 A at 50 °C, nothing beyond 51 °C. */
export const CURVE: CurvePoints = {
  x: [51, 50, 40, 25, 0].map(caseCounts),
  y: [0, 500, 800, 950, 950],
};

/** Counts of `set` that the curve allows at a reading of `case`, rounded down. */
export const curveAt = (counts: number): number => {
  for (let i = 1; i < CURVE.x.length; i += 1) {
    const [x0, x1] = [CURVE.x[i - 1] ?? 0, CURVE.x[i] ?? 0];
    const [y0, y1] = [CURVE.y[i - 1] ?? 0, CURVE.y[i] ?? 0];
    if (counts >= x0 && counts <= x1) {
      return Math.floor(y0 + ((y1 - y0) * (counts - x0)) / (x1 - x0));
    }
  }
  return 0;
};

/** Not closer than this: the protocol's own rule. */
const PERMIT_GAP_TICKS = 50;

/**
 * The least host that can work the board: introduces itself, loads a curve, arms, and answers
 * samples with permits. It judges nothing: what the board does alone is what is being tested.
 */
export class Host {
  readonly world: World;
  /** Every sample received. */
  readonly samples: Sample[] = [];
  /** Every other good line received. */
  readonly heard: Message[] = [];
  /** Lines that the codec found broken. */
  readonly broken: string[] = [];
  hello: Hello | null = null;
  session = "";
  /** What permits ask for; null sends none. */
  wish: { readonly cap: number; readonly aim: number; readonly term: number } | null = null;
  /** Takes a permit on its way to the wire. */
  post: (line: string) => void;
  /** The newest permit that was put on the wire: the sample it names, and its term. */
  permitted: { readonly n: number; readonly tick: number; readonly term: number } | null = null;
  #lastPermitTick = 0;

  constructor(world: World) {
    this.world = world;
    this.post = (line) => world.sendLine(line);
    world.onLine = this.take;
  }

  get last(): Sample {
    const sample = this.samples.at(-1);
    if (sample === undefined) throw new Error("no sample yet");
    return sample;
  }

  /** Takes one received line, without its line feed. */
  take = (text: string): void => {
    const line = text.endsWith("\r") ? text.slice(0, -1) : text;
    const message = line.length > LINE_BYTES_MAX ? null : readLine(line, "host");
    if (message === null || message.kind !== "message") {
      this.broken.push(line);
      return;
    }
    if (message.verb !== "sample") {
      this.heard.push(message);
      return;
    }
    this.samples.push(message.fields);
    this.#permit(message.fields);
  };

  #permit(sample: Sample): void {
    if (this.wish === null) return;
    const since = (sample.tick - this.#lastPermitTick) >>> 0;
    if (this.permitted !== null && since < PERMIT_GAP_TICKS) return;
    const { cap, aim, term } = this.wish;
    this.#lastPermitTick = sample.tick;
    this.permitted = { n: sample.seq, tick: sample.tick, term };
    this.post(encodePermit(this.session, sample.seq, cap, aim, term));
  }

  /** The first line of this verb heard from now on, or a refusal of `asked`; throws after 300 ms. */
  async #hear<V extends Verb>(
    asked: string,
    verb: V,
  ): Promise<Extract<Message, { verb: V }> | Refusal> {
    const from = this.heard.length;
    let found: Message | undefined;
    await this.world.until(`an answer to ${asked}`, 300, () => {
      found = this.heard
        .slice(from)
        .find((m) => (m.verb === "no" ? m.fields.verb === asked : m.verb === verb));
      return found !== undefined;
    });
    return found as Extract<Message, { verb: V }> | Refusal;
  }

  /** Sends a line (without checksum) and waits for its answer; a refusal is returned as such. */
  ask<V extends Verb>(body: string, verb: V): Promise<Extract<Message, { verb: V }> | Refusal> {
    this.world.sendLine(seal(body));
    return this.#hear(body.slice(1).split(" ")[0] ?? "", verb);
  }

  async #wanted<V extends Verb>(body: string, verb: V): Promise<Extract<Message, { verb: V }>> {
    const answer = await this.ask(body, verb);
    if (answer.verb === "no" && verb !== "no") {
      throw new Error(`${body} was refused: ${(answer as Refusal).fields.reason}`);
    }
    return answer as Extract<Message, { verb: V }>;
  }

  /** Introduction: hello, channels, end. */
  async introduce(): Promise<Hello> {
    const hello = await this.#wanted(">who 1", "hello");
    await this.#hear("who", "end");
    if (!("serial" in hello.fields)) throw new Error("the board speaks another version");
    this.hello = hello.fields;
    return hello.fields;
  }

  /** Waits until the newest permit has been acknowledged: then nothing is on the wire down. */
  async quiet(): Promise<void> {
    await this.world.until("a permit's acknowledgement", 300, () => {
      return this.permitted !== null && this.last.ack === this.permitted.n;
    });
  }

  async loadCurve(points: CurvePoints): Promise<void> {
    await this.#wanted(`>stage ${points.x.length}`, "yes");
    for (const [i, x] of points.x.entries()) {
      await this.#wanted(`>point ${i} ${x} ${points.y[i] ?? 0}`, "yes");
    }
    await this.#wanted(`>commit ${curveCrc(points)}`, "yes");
  }

  /** Asks for an arm number and answers it. Permits follow as soon as `wish` is set. */
  async arm(points: CurvePoints = CURVE): Promise<void> {
    const hello = this.hello;
    if (hello === null) throw new Error("introduce first");
    const { fields } = await this.#wanted(">ask arm", "offer");
    this.world.sendLine(
      encodeArm(
        armAnswer({
          number: fields.number,
          boot: fields.boot,
          arms: fields.arms,
          curveCrc: curveCrc(points),
          absolute_counts: hello.absolute,
          term_ticks_min: hello.termMin,
          term_ticks_max: hello.termMax,
          protocol: hello.proto,
          firmware: hello.firmware,
        }),
      ),
    );
    const yes = await this.#hear("arm", "yes");
    if (yes.verb !== "yes") throw new Error(`arming was refused: ${yes.fields.reason}`);
    this.session = String(yes.fields.value);
    this.permitted = null;
  }
}

export type Refusal = Extract<Message, { verb: "no" }>;

/** After a boot: key and loop must have been closed for half a second before the board arms. */
export const SETTLE_ms = 800;

/** A term most hosts use, ticks of one millisecond. */
export const TERM = 500;

/** A board at 25 °C with a host that has brought it to steady light of `aim` counts. */
export const emittingBoard = async (aim = 700, term = TERM): Promise<Host> => {
  const world = new World();
  const host = new Host(world);
  await world.chip.command("case 25");
  await world.pass(SETTLE_ms);
  await host.introduce();
  await host.loadCurve(CURVE);
  await host.arm();
  host.wish = { cap: aim, aim, term };
  await world.until("steady light", 7000, () => host.samples.at(-1)?.values[0] === aim);
  await world.pass(100);
  return host;
};

/** Runs a test on an emitting board of its own, and leaves no process behind. */
export const onBoard = async (act: (host: Host) => Promise<void>): Promise<void> => {
  const host = await emittingBoard();
  try {
    await act(host);
  } finally {
    host.world.stop();
  }
};
