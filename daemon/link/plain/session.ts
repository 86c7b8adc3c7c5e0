import type { Manifest } from "../../model/manifest.ts";
import { newSample, type Sample, STATUS } from "../../model/sample.ts";
import type { LevelOrder, StreamSpec } from "../../model/stream.ts";
import type { Mono_ms } from "../../model/times.ts";
import { type LinkCounts, newCounts } from "../counts.ts";
import { type LinkItem, LinkQueue } from "../queue.ts";
import { RawLog } from "../rawlog.ts";
import type { LinkPhase } from "../session.ts";
import { Silence } from "../silence.ts";
import { TickClock } from "../tick-clock.ts";
import { Waiter } from "../waiter.ts";
import { CutOffDrive } from "./cut-off.ts";
import { streamManifest } from "./manifest.ts";
import { type LineKind, StreamReader } from "./reader.ts";

export interface PlainOptions {
  readonly stream: StreamSpec;
  readonly rate_perS: number;
  /** Current under which the bench counts as dark, in counts of the current channel. */
  readonly dark_counts: number;
}

/** What a watched controller "says" of key, loop and curve: nothing, so nothing is held against it. */
const STATUS_WATCHED = STATUS.key | STATUS.loop | STATUS.curve | STATUS.anchor;
/** Lines that fit are waited for this long, then that none do is told; waiting goes on. */
const FIT_ms = 5000;
/** A stream's own time this much earlier than before is a controller that started anew, ms. */
const BACK_ms = 1000;

/**
 * The link to a controller that merely prints numbers, in the shape of `LinkSession`, so that the
 * same loop, judge and record work with it. It has no permit, no arming and no curve; the only thing
 * it ever sends is the cut-off that the bench file names.
 */
export class PlainSession {
  readonly sample: Sample = newSample();
  readonly counts: LinkCounts = newCounts();
  /** Lines by what they were. */
  readonly kinds: Readonly<Record<LineKind, number>>;
  readonly clock = new TickClock();
  readonly log = new RawLog();
  manifest: Manifest | null = null;
  phase: LinkPhase = "closed";
  private readonly lines: Record<LineKind, number>;
  private readonly options: PlainOptions;
  private readonly reader: StreamReader;
  private readonly queue: LinkQueue;
  private readonly silence: Silence;
  private readonly cutOff: CutOffDrive;
  private readonly fit = new Waiter();
  private readonly current: number;
  private readonly pending: Float64Array;
  private readonly has: Uint8Array;
  private torn = true;
  private own_ms = Number.NaN;
  private tick = Number.NEGATIVE_INFINITY;

  constructor(options: PlainOptions) {
    this.options = options;
    this.reader = new StreamReader(options.stream);
    this.queue = new LinkQueue(this.sample, this.counts, this.log);
    this.silence = new Silence(this.queue);
    this.cutOff = new CutOffDrive(options.stream.cutOff, this.queue);
    this.lines = { values: 0, some: 0, text: 0, half: 0, broken: 0 };
    this.kinds = this.lines;
    this.current = options.stream.columns.findIndex((column) => column.channel === "current");
    this.pending = new Float64Array(this.reader.values.length);
    this.has = new Uint8Array(this.reader.values.length);
  }

  /** The port opened. Its first line may be torn, and its board may just be starting. */
  connected(now: Mono_ms): void {
    this.queue.at(now);
    this.forget();
    this.torn = true;
    this.queue.setOpen(true);
    this.counts.connections += 1;
    this.cutOff.opened();
    this.queue.fact("port-open", 0, "");
    this.await();
    this.elapse(now);
  }

  disconnected(now: Mono_ms, why: string): void {
    this.queue.at(now);
    this.forget();
    this.cutOff.clear();
    this.fit.end();
    this.queue.setOpen(false);
    this.phase = "closed";
    this.queue.fact("port-closed", 0, why);
  }

  /** Whether a line may complete a sample: only the newest of a batch may feed a one-shot. */
  brings(line: string): boolean {
    const kind = this.reader.read(line);
    return kind === "values" || kind === "some";
  }

  feed(line: string, now: Mono_ms): void {
    if (this.phase === "closed") return;
    this.queue.at(now);
    this.counts.received += 1;
    this.log.received(line, now);
    if (this.torn) {
      // The port opened somewhere within this line: 1.52 may be the end of 11.52.
      this.torn = false;
      this.counts.early += 1;
    } else this.read(line, now);
    this.elapse(now);
  }

  elapse(now: Mono_ms): void {
    if (this.phase === "closed") return;
    this.queue.at(now);
    this.silence.elapse(now);
    this.cutOff.elapse(now);
    if (!this.fit.expired(now)) return;
    this.fit.end();
    this.queue.fact("no-answer", this.lines.text, "stream");
  }

  nextDeadline(): Mono_ms {
    if (this.phase === "closed") return Number.POSITIVE_INFINITY as Mono_ms;
    return Math.min(this.silence.next(), this.cutOff.next(), this.fit.next()) as Mono_ms;
  }

  take(): LinkItem | null {
    return this.queue.take();
  }

  takeLine(): string | null {
    return this.queue.takeLine()?.line ?? null;
  }

  /** A level that a modem line is to take, or null; before everything else that waits. */
  takeLevel(): LevelOrder | null {
    return this.cutOff.takeLevel();
  }

  /** The judging step found the newest sample safe: the one-shot is fed, where there is one. */
  permit(n: number): void {
    if (this.phase === "ready" && this.sample.seq === n) this.cutOff.feed();
  }

  dark(code: number): void {
    this.cutOff.dark(code);
  }

  /** A person lets the cut-off go. */
  reset(_cause: number): void {
    this.cutOff.release();
  }

  /** The judge refuses arming on a watched bench; nothing is begun here either. */
  arm(): void {
    this.queue.fact("arm-refused", -1, "this controller takes no permits");
  }

  /** Such a controller holds no curve. */
  loadCurve(): void {}

  private forget(): void {
    this.manifest = null;
    this.own_ms = Number.NaN;
    this.tick = Number.NEGATIVE_INFINITY;
    this.has.fill(0);
    this.silence.clear();
  }

  private await(): void {
    this.phase = "asking";
    this.fit.begin("stream", FIT_ms);
  }

  private read(line: string, now: Mono_ms): void {
    const { banner } = this.options.stream;
    if (banner !== "" && line.includes(banner)) {
      this.lines.text += 1;
      if (this.manifest !== null) this.restarted(1, "it said its banner again");
      return;
    }
    if (this.cutOff.heard(line)) {
      this.lines.text += 1;
      return;
    }
    const kind = this.reader.read(line);
    this.lines[kind] += 1;
    if (kind === "half" || kind === "broken") {
      this.counts.form += 1;
      this.log.wasBroken(line, kind, now);
      this.silence.badLine(kind, now);
    } else if (kind === "values") this.complete(this.reader.values, now);
    else if (kind === "some") this.gather(now);
  }

  /** A controller may print its values one to a line; a column that comes again begins anew. */
  private gather(now: Mono_ms): void {
    const { values, found } = this.reader;
    if (found.some((one, i) => one === 1 && this.has[i] === 1)) this.has.fill(0);
    let count = 0;
    for (let i = 0; i < found.length; i += 1) {
      if (found[i] === 1) {
        this.pending[i] = values[i] ?? Number.NaN;
        this.has[i] = 1;
      }
      count += this.has[i] ?? 0;
    }
    if (count === found.length) this.complete(this.pending, now);
  }

  /** All columns of one moment are there. */
  private complete(values: Float64Array, now: Mono_ms): void {
    this.has.fill(0);
    const { time, columns } = this.options.stream;
    let at_ms: number = now;
    if (time !== null) {
      at_ms = (values[columns.length] ?? Number.NaN) * time.unit_ms;
      if (!Number.isFinite(at_ms)) {
        this.wasBroken(now);
        return;
      }
      if (at_ms < this.own_ms - BACK_ms) {
        this.restarted(2, `its time went back by ${Math.round((this.own_ms - at_ms) / 1000)} s`);
      }
      this.own_ms = at_ms;
    }
    if (this.manifest === null) this.introduce(now);
    this.silence.goodLine(now);
    this.fill(values, at_ms);
    if (time !== null) this.clock.sample(Math.round(at_ms), now);
    const isDark =
      this.current >= 0 && (this.sample.values[this.current] ?? 0) < this.options.dark_counts;
    this.cutOff.sampled(isDark);
    this.queue.sample(now);
  }

  private wasBroken(now: Mono_ms): void {
    this.lines.broken += 1;
    this.counts.form += 1;
    this.silence.badLine("broken", now);
  }

  private fill(values: Float64Array, at_ms: number): void {
    const { sample } = this;
    this.counts.samples += 1;
    sample.seq = (sample.seq + 1) >>> 0;
    // Lines that were read at once, or a time in whole seconds, still come one after another.
    this.tick = Math.max(Math.round(at_ms), this.tick + 1);
    sample.tick = this.tick % 4_294_967_296;
    sample.status = STATUS_WATCHED;
    sample.conversions = sample.seq & 0xffff;
    for (const [i, column] of this.options.stream.columns.entries()) {
      const count = Math.round((values[i] ?? Number.NaN) / column.step);
      // No reading, or one that cannot be true, lies just outside the range: the judge then says so.
      const below = column.count_min - 1;
      const above = column.count_max + 1;
      sample.values[i] = Number.isNaN(count) ? below : Math.max(below, Math.min(above, count));
      sample.fresh[i] = 1;
    }
  }

  private introduce(now: Mono_ms): void {
    this.fit.end();
    this.manifest = streamManifest(this.options.stream, this.options.rate_perS);
    this.clock.clear(this.manifest.tick_us);
    this.silence.expect(this.options.rate_perS, now);
    this.phase = "ready";
    this.queue.fact("introduced", 0, "");
  }

  private restarted(by: 1 | 2, text: string): void {
    this.counts.resets += 1;
    this.forget();
    this.cutOff.opened();
    this.queue.fact("board-reset", by, text);
    this.await();
  }
}
