import { STATUS } from "../../../daemon/model/sample.ts";
import { armAnswer, type CurvePoints, curveCrc } from "../../../firmware-protocol/answer.ts";
import { seal } from "../../../firmware-protocol/line.ts";
import { type Message, readLine } from "../../../firmware-protocol/messages.ts";
import { HELLO, introductionOf } from "../firmware-protocol/introduction.ts";

/**
 * A peer that speaks the board's side of the protocol, for tests of the session alone. It enforces
 * nothing: what a board must enforce is tested on the real core.
 */
export class FakeBoard {
  /** Verbs that it takes in silence, as if its answer were lost. */
  readonly mute = new Set<string>();
  /** Verbs that it refuses, with the reason. */
  readonly refuse = new Map<string, string>();
  /** Everything received, as bodies. */
  readonly heard: string[] = [];
  hello: Partial<typeof HELLO> = {};
  state: "standby" | "armed" | "emitting" | "tripped" = "standby";
  cause = 0;
  seq = 0;
  tick = 0;
  ticksPerSample = 20;
  anchors = true;
  curve: CurvePoints | null = null;
  ackSeq = "-";
  private staged: [number, number][] = [];
  private readonly out: string[] = [];

  /** Lines it has to say, without ends. */
  take(): string[] {
    return this.out.splice(0);
  }

  say(body: string): void {
    this.out.push(seal(body));
  }

  /** Loses its session, curve and counters, as a reset does. */
  reboot(banner: "banner" | "silent"): void {
    this.seq = 0;
    this.tick = 0;
    this.curve = null;
    if (this.state !== "standby") this.cause = 5;
    this.state = this.state === "standby" ? "standby" : "tripped";
    if (banner === "banner") this.say("<boot bs-test-1 watchdog");
  }

  /** One sample more. */
  sample(): string {
    this.tick = (this.tick + this.ticksPerSample) >>> 0;
    const line = this.sampleLine();
    this.seq = (this.seq + 1) >>> 0;
    this.out.push(line);
    return line;
  }

  private sampleLine(): string {
    let status = STATUS.key | STATUS.loop | STATUS.fan;
    if (this.anchors) status |= STATUS.anchor;
    if (this.state === "armed") status |= STATUS.armed;
    if (this.state === "emitting") status |= STATUS.armed | STATUS.emitting;
    if (this.state === "tripped") status |= STATUS.tripped;
    const bits = status.toString(16).toUpperCase().padStart(4, "0");
    const age = this.ackSeq === "-" ? "-" : 1;
    return seal(
      `<sample ${this.seq} ${this.tick} ${bits} ${this.cause} ${this.ackSeq} ${age} ${this.seq & 0xffff} 0 0 0 512 3`,
    );
  }

  receive(line: string): void {
    const message = readLine(line, "controller");
    if (message.kind !== "message") throw new Error(`the session sent a broken line: ${line}`);
    this.heard.push(line.slice(1, -5));
    if (this.mute.has(message.verb)) return;
    const reason = this.refuse.get(message.verb);
    if (reason === undefined) this.answer(message);
    else this.say(`<no ${message.verb} ${reason}`);
  }

  private answer(message: Message): void {
    switch (message.verb) {
      case "who":
        this.introduce();
        break;
      case "ask":
        this.say("<offer arm 1A2B3C4D 8 3");
        break;
      case "arm":
        this.arm(message.fields.answer);
        break;
      case "permit":
        this.state = message.fields.aim > 0 ? "emitting" : "armed";
        this.ackSeq = String(message.fields.n);
        break;
      case "dark":
        if (this.state !== "tripped" && message.fields.code !== 0 && this.state !== "standby") {
          this.state = "tripped";
          this.cause = message.fields.code;
        } else if (this.state !== "tripped") this.state = "standby";
        this.say(`<yes dark ${message.fields.code}`);
        break;
      case "reset":
        this.state = "standby";
        this.say(`<yes reset ${message.fields.cause}`);
        break;
      case "status":
        this.say("<counts 1 2 3 4 5 6 7 8 9");
        break;
      default:
        this.curveLine(message);
    }
  }

  private introduce(): void {
    const crc = this.curve === null ? "00000000" : curveCrc(this.curve);
    this.out.push(...introductionOf({ curve: crc, ...this.hello }));
  }

  private arm(answer: string): void {
    const right = armAnswer({
      number: "1A2B3C4D",
      boot: 8,
      arms: 3,
      curveCrc: this.curve === null ? "00000000" : curveCrc(this.curve),
      absolute_counts: Number(HELLO.absolute),
      term_ticks_min: Number(HELLO.termMin),
      term_ticks_max: Number(HELLO.termMax),
      protocol: 1,
      firmware: HELLO.firmware,
    });
    if (Number.parseInt(answer, 16) !== right) this.say("<no arm wrong");
    else {
      this.state = "armed";
      this.say("<yes arm 0BADF00D");
    }
  }

  private curveLine(message: Message): void {
    if (message.verb === "stage") {
      this.staged = [];
      if (this.state !== "standby") this.say("<no stage state");
      else this.say(`<yes stage ${message.fields.count}`);
    } else if (message.verb === "point") {
      this.staged.push([message.fields.x, message.fields.y]);
      this.say(`<yes point ${message.fields.i}`);
    } else if (message.verb === "commit") {
      const points = { x: this.staged.map(([x]) => x), y: this.staged.map(([, y]) => y) };
      if (curveCrc(points) !== message.fields.crc) this.say("<no commit checksum");
      else {
        this.curve = points;
        this.say(`<yes commit ${message.fields.crc}`);
      }
    } else if (message.verb === "readback" && this.curve !== null) {
      const { x, y } = this.curve;
      this.say(`<curve 0 ${x[0]} ${y[0]} ${x.length} ${curveCrc(this.curve)}`);
    }
  }
}
