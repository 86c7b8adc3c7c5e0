import type { CutOff, LevelOrder } from "../../model/stream.ts";
import type { LinkQueue } from "../queue.ts";
import { Waiter } from "../waiter.ts";

/** Pause between two orders while the light is still seen. */
const REPEAT_ms = 200;
/** Orders without the light going before that is told; they go on after that. */
const REPEATS_TOLD = 10;

/**
 * Drives the cut-off that a watched bench names. A static line is asserted by the port's opening and
 * stays so until a person lets it go; a one-shot is fed only by the judging step; a text is sent
 * again until the answer comes.
 */
export class CutOffDrive {
  /** Whether the light is ordered off. A line is from the port's opening on. */
  private cut = false;
  private code = -1;
  private repeats = 0;
  private fed = false;
  private level: LevelOrder | null = null;
  private readonly waiter = new Waiter();
  private readonly cutOff: CutOff | null;
  private readonly queue: LinkQueue;

  constructor(cutOff: CutOff | null, queue: LinkQueue) {
    this.cutOff = cutOff;
    this.queue = queue;
  }

  /** The port opened: its lines are asserted now, whatever they were. */
  opened(): void {
    this.clear();
    if (this.cutOff?.kind !== "line") return;
    this.cut = true;
    if (this.cutOff.mode === "static") this.set(true);
  }

  clear(): void {
    this.cut = false;
    this.code = -1;
    this.level = null;
    this.fed = false;
    this.waiter.end();
  }

  /** Cuts the light, as far as there is a way to. */
  dark(code: number): void {
    if (this.cutOff === null) return;
    if (this.code < 0) this.repeats = 0;
    this.cut = true;
    this.code = code;
    this.order();
  }

  /** A person lets it go: a line is released, a one-shot may be fed again. */
  release(): void {
    this.cut = false;
    this.code = -1;
    this.waiter.end();
    if (this.cutOff?.kind === "line" && this.cutOff.mode === "static") this.set(false);
  }

  /** Feeds the one-shot once. Called for a permit of the judging step, and for nothing else. */
  feed(): void {
    if (this.cut || this.cutOff?.kind !== "line" || this.cutOff.mode !== "toggled") return;
    this.fed = !this.fed;
    this.set(this.fed);
  }

  /** A line that may be the answer to a cut-off text. Whether it was. */
  heard(line: string): boolean {
    if (this.code < 0 || this.cutOff?.kind !== "text") return false;
    if (!line.includes(this.cutOff.expect)) return false;
    this.confirm();
    return true;
  }

  /** A sample was read: whether the light that was ordered off is gone. */
  sampled(isDark: boolean): void {
    if (this.code >= 0 && isDark) this.confirm();
  }

  elapse(now: number): void {
    if (!this.waiter.expired(now)) return;
    this.repeats += 1;
    if (this.repeats === REPEATS_TOLD) this.queue.fact("no-answer", this.repeats, "dark");
    this.order();
  }

  next(): number {
    return this.waiter.next();
  }

  /** The level to put on the line now, or null. */
  takeLevel(): LevelOrder | null {
    const { level } = this;
    this.level = null;
    return level;
  }

  private order(): void {
    const { cutOff } = this;
    if (cutOff === null) return;
    this.waiter.begin("dark", cutOff.kind === "text" ? cutOff.within_ms : REPEAT_ms);
    if (cutOff.kind === "text") {
      this.queue.purge("dark");
      this.queue.send(cutOff.send, "dark");
    } else if (cutOff.mode === "static") this.set(true);
  }

  private confirm(): void {
    this.queue.fact("dark-confirmed", this.code, "");
    this.code = -1;
    this.waiter.end();
  }

  private set(asserted: boolean): void {
    if (this.cutOff?.kind === "line") this.level = { line: this.cutOff.line, asserted };
  }
}
