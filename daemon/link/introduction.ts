import { seal } from "../../firmware-protocol/line.ts";
import { ManifestReader } from "../../firmware-protocol/manifest.ts";
import { type Message, PROTOCOL_VERSION } from "../../firmware-protocol/messages.ts";
import type { Manifest } from "../model/manifest.ts";
import type { LinkQueue } from "./queue.ts";
import { Waiter } from "./waiter.ts";

/** A whole introduction comes within this; 64 channels at 115200 baud take 0.4 s. */
const INTRODUCTION_ms = 1500;
/** Pause before a board is asked again: a boot loader may be listening meanwhile. */
const WHO_PAUSE_ms = 500;
/** Times a board is asked before the link gives up: ten seconds and more, longer than it boots. */
export const WHO_TRIES = 8;

type Step = "idle" | "waiting" | "pausing";

/** What a line or a moment brought. */
export type IntroductionResult = "nothing" | "introduced" | "stopped";

/**
 * Asks who is there, as often as it takes, and never relies on a greeting: banners are missed, first
 * lines are torn, and opening a port resets many boards.
 */
export class Introduction {
  /** What the board said of itself, once `introduced`. */
  manifest: Manifest | null = null;
  private step: Step = "idle";
  private tries = 0;
  private readonly waiter = new Waiter();
  private readonly reader = new ManifestReader();
  private problems = "";
  private heard = false;
  /** Given up for want of any sign of a board: the first sign later is worth asking again. */
  canResume = false;
  private readonly queue: LinkQueue;

  constructor(queue: LinkQueue) {
    this.queue = queue;
  }

  get asking(): boolean {
    return this.step !== "idle";
  }

  /** Forgets everything, and asks nobody. */
  stop(): void {
    this.step = "idle";
    this.manifest = null;
    this.waiter.end();
    this.reader.clear();
  }

  /** Forgets the board and asks anew, with all tries ahead. */
  begin(): void {
    this.stop();
    this.tries = 0;
    this.problems = "";
    this.heard = false;
    this.canResume = false;
    this.ask();
  }

  /** A good line came that cannot be read before the introduction: somebody is there. */
  hear(): void {
    this.heard = true;
  }

  /** A line that belongs to an introduction. `line` is the whole of it, as it came. */
  read(message: Message, line: string): IntroductionResult {
    if (this.step === "idle") return "nothing";
    switch (message.verb) {
      case "hello":
        if (message.fields.firmware === null) return this.otherVersion(message.fields.proto);
        this.reader.begin(message.fields);
        return "nothing";
      case "channel":
        this.reader.channel(message.fields, line);
        return "nothing";
      case "end":
        return this.close(message.fields);
      case "no":
        return this.refused(message.fields.reason, message.fields.detail);
      default:
        return "nothing";
    }
  }

  elapse(now: number): IntroductionResult {
    if (!this.waiter.expired(now)) return "nothing";
    if (this.step === "pausing") {
      this.ask();
      return "nothing";
    }
    return this.again();
  }

  next(): number {
    return this.waiter.next();
  }

  private ask(): void {
    this.tries += 1;
    this.step = "waiting";
    this.reader.clear();
    this.waiter.begin("who", INTRODUCTION_ms);
    this.queue.send(seal(`>who ${PROTOCOL_VERSION}`), "plain");
  }

  /** Pauses before the next try, or gives up after the last and says what stood in the way. */
  private again(): IntroductionResult {
    if (this.tries < WHO_TRIES) {
      this.step = "pausing";
      this.waiter.begin("pause", WHO_PAUSE_ms);
      return "nothing";
    }
    this.stop();
    this.canResume = !this.heard && this.problems === "";
    if (this.problems === "") this.queue.fact("no-answer", this.tries, "who");
    else this.queue.fact("not-introduced", this.tries, this.problems);
    return "stopped";
  }

  private close(fields: Parameters<ManifestReader["end"]>[0]): IntroductionResult {
    const result = this.reader.end(fields);
    if (result.kind === "problems") {
      this.problems = result.problems.join("; ");
      return this.again();
    }
    this.stop();
    this.manifest = result.manifest;
    return "introduced";
  }

  private refused(reason: string, detail: unknown): IntroductionResult {
    if (reason === "version") {
      return this.otherVersion(typeof detail === "number" ? detail : 0);
    }
    // The board was lit and tripped by this very ask: it will answer the next one.
    this.problems = `the board refused to introduce itself: ${reason}`;
    return this.again();
  }

  private otherVersion(version: number): IntroductionResult {
    this.stop();
    this.queue.fact(
      "wrong-version",
      version,
      `the board speaks version ${version} of the line protocol; this program speaks version ${PROTOCOL_VERSION}. Flash firmware of version ${PROTOCOL_VERSION}, or use a program for the board's.`,
    );
    return "stopped";
  }
}
