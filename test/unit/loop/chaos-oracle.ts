import type { BenchEvent } from "../../../daemon/model/event.ts";
import { counterDistance } from "../../../daemon/model/times.ts";
import { derated_mA } from "../../../daemon/physics/diode.ts";
import { checkLine } from "../../../firmware-protocol/line.ts";
import { north } from "./bench.ts";

/** Facts of the built-in board, written down a second time: the oracle asks neither side for them. */
const ABSOLUTE_counts = 4400;
const SET_mAperCOUNT = 0.5;
const TERM_ticks = { min: 150, max: 10_000 };
const FALL_ms = 20;
const CASE = { open_counts: 15_985, short_counts: 569, over_counts: 4326, error_K: 0.5 };
const LIMIT_mA = 1900;
const TRIPPED = 1 << 2;
const FAULT_READINGS = 6;
/** Current that still counts as dark, mA. */
const DARK_mA = 5;

const PERMIT = /^>permit ([0-9A-F]{8}) (\d+) (\d+) (\d+) (\d+) [0-9A-F]{4}$/;

/** Temperature at a case count: 10 kohm at 25 °C, B 3950 K, to ground under 10 kohm. */
function case_degC(counts: number): number {
  const ratio = counts / (16_384 - counts);
  return 1 / (1 / 298.15 + Math.log(ratio) / 3950) - 273.15;
}

/** The most current the bench file allows at a case count, mA. */
const allowed_mA = (counts: number): number =>
  Math.min(LIMIT_mA, derated_mA(north.derating, case_degC(counts) + CASE.error_K));

interface Live {
  readonly until_tick: number;
  readonly cap: number;
  readonly aim: number;
}

/** What stands at the diode in one millisecond. */
export interface AtDiode {
  readonly tick: number;
  readonly drive_counts: number;
  readonly current_mA: number;
  readonly key: boolean;
  readonly loop: boolean;
  readonly hostState: string;
  readonly hostCause: string;
  readonly hostRuns: boolean;
}

/**
 * What must hold at every millisecond, worked out a second time from what went over the wire and
 * what flows through the diode. It shares with the two sides only the checksum, the derating's
 * straight lines and the bench file.
 */
export class Oracle {
  readonly violations: string[] = [];
  readonly trips: string[] = [];
  sessions = 0;
  permits = 0;
  lit_ms = 0;
  /** Set by the rig round the judging of received lines. */
  judging = false;
  boardTripped = false;
  hostLatched = "";
  armAsked = false;
  resetAsked = false;
  mostAsked_mA = 0;
  #boardCause = -1;
  #mustBeTripped = false;
  #boardArmAsked = false;
  #token = "";
  #newest: number | null = null;
  #live: Live | null = null;
  readonly #ticks = new Map<number, number>();
  readonly #cases = new Map<number, number>();
  readonly #written = new Set<string>();
  #toBoard = "";
  #cancels = 0;
  #cut = false;
  #fed = -1;
  #permitted = "";
  #case = 10_000;
  #beyond = 0;
  #hostTripped_ms = Number.NaN;
  #now_ms = 0;
  readonly #roofs = new Float64Array(FALL_ms + 2);

  fail(what: string): void {
    if (this.violations.length < 10) this.violations.push(`at ${this.#now_ms} ms: ${what}`);
  }

  // The host's side.

  asked(verb: string, current_mA: number): void {
    if (verb === "arm") {
      this.armAsked = true;
      this.#boardArmAsked = true;
    }
    if (verb === "arm" || verb === "set")
      this.mostAsked_mA = Math.max(this.mostAsked_mA, current_mA);
    if (verb === "reset") this.resetAsked = true;
  }

  fedTo(lines: readonly string[]): void {
    for (const line of lines) {
      if (!line.startsWith("<sample ") || checkLine(line, "host") !== null) continue;
      this.#fed = Number(line.split(" ")[1]);
    }
  }

  hostWrites(line: string): void {
    const permit = PERMIT.exec(line);
    if (permit === null) return;
    const [, token = "", n = "", cap = "", aim = ""] = permit;
    this.#written.add(line);
    if (!this.judging) this.fail(`a permit was written outside of judging: ${line}`);
    if (Number(n) !== this.#fed) this.fail(`the newest sample is ${this.#fed}: ${line}`);
    if (this.#permitted === `${token} ${n}`) this.fail(`two permits for one sample: ${line}`);
    if (this.hostLatched !== "") this.fail(`a permit while latched (${this.hostLatched}): ${line}`);
    this.#permitted = `${token} ${n}`;
    const counts = this.#cases.get(Number(n)) ?? 0;
    const most_mA = allowed_mA(counts);
    if (Number(cap) * SET_mAperCOUNT > most_mA + SET_mAperCOUNT) {
      this.fail(`the cap is above ${most_mA} mA, the most at ${counts} counts: ${line}`);
    }
    if (Number(aim) > Number(cap)) this.fail(`the aim is above the cap: ${line}`);
    if (Number(aim) * SET_mAperCOUNT > this.mostAsked_mA + SET_mAperCOUNT) {
      this.fail(`nobody asked for as much: ${line}`);
    }
  }

  event(event: BenchEvent): void {
    if (event.kind === "trip") {
      this.trips.push(event.hazard);
      if (this.hostLatched !== "") {
        this.fail(`a second first-out, ${event.hazard} after ${this.hostLatched}`);
      }
      this.hostLatched = event.hazard;
      this.#hostTripped_ms = this.#now_ms;
      this.armAsked = false;
      this.resetAsked = false;
    } else if (event.kind === "reset") {
      if (this.hostLatched === "") this.fail("a reset of nothing");
      if (!this.resetAsked) this.fail("the latch went although nobody asked for it");
      this.hostLatched = "";
      this.#hostTripped_ms = Number.NaN;
    } else if (event.kind === "armed" && event.data.a !== 0) {
      if (this.hostLatched !== "") this.fail("armed while latched");
      if (!this.armAsked) this.fail("armed although nobody asked for it");
    }
  }

  // The board's side.

  /** Readings as the board is about to see them. */
  reads(caseCounts: number): void {
    const faulty = caseCounts >= CASE.open_counts || caseCounts <= CASE.short_counts;
    if (!faulty) this.#case = caseCounts;
    this.#beyond = faulty || caseCounts <= CASE.over_counts ? this.#beyond + 1 : 0;
  }

  boots(): void {
    this.#mustBeTripped = this.#token !== "" || this.boardTripped;
    this.#endSession();
    this.#ticks.clear();
    this.#toBoard = "";
    this.#cancels = 0;
  }

  boardSends(line: string): void {
    const words = line.split(" ");
    if (words[0] === "<sample")
      this.#boardSample(words.map(Number), Number.parseInt(words[3] ?? "", 16));
    else if (line.startsWith("<yes arm ")) {
      if (this.boardTripped) this.fail("the board armed while tripped");
      if (!this.#boardArmAsked) this.fail("the board opened a session that nobody asked for");
      this.#boardArmAsked = false;
      this.#endSession();
      this.#token = words[2] ?? "";
      this.sessions++;
    } else if (line.startsWith("<yes reset ")) {
      this.boardTripped = false;
      this.#mustBeTripped = false;
    }
  }

  #boardSample(fields: readonly number[], status: number): void {
    const [, seq = 0, tick = 0, , cause = 0] = fields;
    this.#ticks.set(seq, tick);
    this.#cases.set(seq, fields[11] ?? 0);
    const tripped = (status & TRIPPED) !== 0;
    if (tripped && this.boardTripped && cause !== this.#boardCause) {
      this.fail(`the board's first cause ${this.#boardCause} became ${cause}`);
    }
    if (!tripped && this.boardTripped) this.fail("the board lost its latch");
    if (!tripped && this.#mustBeTripped) this.fail("a reset while armed did not latch");
    if (tripped) this.#endSession();
    this.#mustBeTripped = false;
    this.boardTripped = tripped;
    this.#boardCause = cause;
  }

  #endSession(): void {
    this.#token = "";
    this.#newest = null;
    this.#live = null;
  }

  /** Bytes that reach the board, just before the pass that reads them. */
  reachesBoard(bytes: Uint8Array, tick: number): void {
    for (const byte of bytes) {
      this.#cancels = byte === 0x18 ? this.#cancels + 1 : 0;
      if (this.#cancels === 3) {
        this.#cancels = 0;
        this.cuts();
      }
      if (byte !== 0x0a) {
        this.#toBoard += String.fromCharCode(byte);
        continue;
      }
      this.#boardReads(this.#toBoard.replace(/\r$/, ""), tick);
      this.#toBoard = "";
    }
  }

  /** A dark of whatever form has reached the board. */
  cuts(): void {
    this.#cut = true;
    this.#endSession();
  }

  #boardReads(line: string, tick: number): void {
    if (/^>?dark/i.test(line)) this.cuts();
    const permit = PERMIT.exec(line);
    if (permit === null || checkLine(line, "controller") !== null) return;
    const [n = 0, cap = 0, aim = 0, term = 0] = permit.slice(2).map(Number);
    const judged_tick = this.#ticks.get(n);
    if (permit[1] !== this.#token || judged_tick === undefined) return;
    if (this.#newest !== null && counterDistance(n, this.#newest) <= 0) return;
    if (counterDistance(tick, judged_tick) >= term || term < TERM_ticks.min) return;
    if (term > TERM_ticks.max || cap > ABSOLUTE_counts || aim > cap) return;
    if (!this.#written.has(line)) this.fail(`a permit that the host never wrote: ${line}`);
    this.permits++;
    this.#newest = n;
    this.#live = { until_tick: (judged_tick + term) >>> 0, cap, aim };
  }

  /** Looks at the diode after a whole pass of the board. */
  look(at: AtDiode): void {
    this.#now_ms++;
    const live =
      this.#live !== null && counterDistance(this.#live.until_tick, at.tick) > 0
        ? this.#live
        : null;
    const roof_mA =
      live === null ? 0 : Math.min(live.cap * SET_mAperCOUNT, allowed_mA(this.#case) + 1);
    if (at.drive_counts > 0) this.#lookAtDrive(at, live, roof_mA);
    this.#roofs[this.#now_ms % this.#roofs.length] = roof_mA;
    const highest_mA = Math.max(...this.#roofs);
    if (at.current_mA > highest_mA * 1.01 + DARK_mA) {
      this.fail(`${at.current_mA} mA flow; the roof of the last ${FALL_ms} ms is ${highest_mA} mA`);
    }
    if (at.current_mA > DARK_mA) this.lit_ms++;
    this.#cut = false;
    if (at.hostRuns) this.#lookAtHost(at);
  }

  #lookAtDrive(at: AtDiode, live: Live | null, roof_mA: number): void {
    const { drive_counts } = at;
    if (live === null) this.fail(`a drive of ${drive_counts} without a live permit`);
    else if (drive_counts > live.aim) this.fail(`drive ${drive_counts} above the aim ${live.aim}`);
    if (drive_counts * SET_mAperCOUNT > roof_mA) {
      this.fail(`a drive of ${drive_counts} counts under a roof of ${roof_mA} mA`);
    }
    if (this.boardTripped) this.fail("a drive while the board is tripped");
    if (!at.key || !at.loop) this.fail("a drive with the key off or the loop open");
    if (this.#cut) this.fail("a drive in the millisecond of a dark");
    if (this.#beyond >= FAULT_READINGS) this.fail("a drive on a case that is over, open or short");
    if (this.#now_ms - this.#hostTripped_ms > north.controller.term_ms + 1) {
      this.fail("a drive longer than the term after the host's trip");
    }
  }

  #lookAtHost({ hostState, hostCause }: AtDiode): void {
    if (this.hostLatched === "") return;
    if (hostState !== "tripped") this.fail(`latched by ${this.hostLatched}, yet ${hostState}`);
    if (hostCause !== this.hostLatched) {
      this.fail(`the first-out ${this.hostLatched} became ${hostCause}`);
    }
  }
}
