import { counterDistance } from "../model/times.ts";

/** A late sample can be this many numbers old; more than that is a board that started anew. */
const REORDER_MAX = 64;
/** More numbers than this cannot be lost in one go: half an hour at 1000 samples a second. */
const LOST_MAX = 1_800_000;

export type Order = "first" | "next" | "duplicate" | "reordered" | "restarted";

/**
 * Judges each sample's number and tick against the one before, and unwraps both. Numbers are 32
 * bits and wrap, so they are compared by signed distance.
 */
export class Sequence {
  private known = false;
  private seq = 0;
  private tick = 0;
  private lateSeq = 0;
  private lateTick = 0;
  private late = false;
  /** Numbers skipped before the sample judged last. */
  lost = 0;
  /** Number and tick of the newest sample since `clear`, unwrapped. */
  seqTotal = 0;
  tickTotal = 0;

  clear(): void {
    this.known = false;
    this.late = false;
    this.lost = 0;
  }

  /** Place of a sample in the stream. Only "first" and "next" move on. */
  judge(seq: number, tick: number): Order {
    this.lost = 0;
    if (!this.known) {
      this.known = true;
      this.seqTotal = seq;
      this.tickTotal = tick;
      this.keep(seq, tick);
      return "first";
    }
    const numbers = counterDistance(seq, this.seq);
    const ticks = counterDistance(tick, this.tick);
    if (numbers === 0 && ticks === 0) return "duplicate";
    // A board that converts as fast as its clock ticks may give two samples one tick; whether the
    // clock stands still is the judge's to say.
    if (numbers > 0 && numbers <= LOST_MAX && ticks >= 0) {
      this.lost = numbers - 1;
      this.seqTotal += numbers;
      this.tickTotal += ticks;
      this.keep(seq, tick);
      return "next";
    }
    if (numbers < 0 && numbers >= -REORDER_MAX && ticks < 0 && !this.goesOnFromLate(seq, tick)) {
      this.late = true;
      this.lateSeq = seq;
      this.lateTick = tick;
      return "reordered";
    }
    return "restarted";
  }

  private keep(seq: number, tick: number): void {
    this.seq = seq;
    this.tick = tick;
    this.late = false;
  }

  /** Two late samples in ascending order are no late samples: the board counts anew. */
  private goesOnFromLate(seq: number, tick: number): boolean {
    return (
      this.late &&
      counterDistance(seq, this.lateSeq) === 1 &&
      counterDistance(tick, this.lateTick) > 0
    );
  }
}
