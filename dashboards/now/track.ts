import type { SeriesJson, Snapshot, TraceJson } from "../../daemon/desk/api.ts";

/** The quantities that the picture draws, and under which name the record keeps each. */
export const RECORDED = {
  current: "current",
  ceiling: "judge.ceiling",
  floor: "judge.floor",
  maker: "judge.maker",
  asked: "judge.asked",
  output: "photodiode",
  expected: "judge.expected",
  degC: "case",
  state: "judge.state",
} as const;
export type Quantity = keyof typeof RECORDED;
const QUANTITIES = Object.keys(RECORDED) as Quantity[];

/** One second of the past. NaN where a value is not known. */
export type Row = Readonly<Record<Quantity, number>> & { readonly t: number };

/** As much past as the widest picture shows, and a little more. */
export const TRACK_ms = 41 * 60_000;
const ROW_ms = 1000;
/** Longer than this without a row is a gap, ms. */
const GAP_ms = 2500;

const STATES = ["offline", "standby", "armed", "emitting", "tripped"];
const MAKERS = "derating junction bench user plan hazard unattended board".split(" ");
const nan = (value: number | null): number => value ?? Number.NaN;

/** A row in which nothing is known: it breaks every line, and the hatch stands in its place. */
const unknownRow = (t: number): Row => ({
  t,
  ...(Object.fromEntries(QUANTITIES.map((q) => [q, Number.NaN])) as Record<Quantity, number>),
});

export const isUnknown = (row: Row): boolean =>
  Number.isNaN(row.current) && Number.isNaN(row.degC) && Number.isNaN(row.ceiling);

function rowOf(s: Snapshot): Row {
  return {
    t: s.at,
    current: nan(s.current_mA),
    ceiling: nan(s.ceiling_mA),
    floor: nan(s.floor_mA),
    maker: MAKERS.indexOf(s.maker),
    asked: nan(s.asked_mA),
    output: nan(s.output_mW),
    expected: nan(s.expected_mW),
    degC: nan(s.case_degC),
    state: STATES.indexOf(s.state),
  };
}

/** The past as rows in ascending time, from the record first and then from the live stream. */
export class Track {
  rows: Row[] = [];
  /** Counts up when rows other than the last changed, so that the picture is drawn anew. */
  version = 0;

  /** Adds what was just heard. One row a second is kept; the newest one replaces its second. */
  append(s: Snapshot): void {
    const row = s.state === "offline" ? unknownRow(s.at) : rowOf(s);
    const last = this.rows[this.rows.length - 1];
    if (last !== undefined && row.t < last.t - ROW_ms) {
      // Civil time was set back. Rows from the future would never leave the picture.
      this.rows = this.rows.filter((kept) => kept.t <= row.t);
      this.version++;
    }
    if (last !== undefined && Math.floor(last.t / ROW_ms) === Math.floor(row.t / ROW_ms)) {
      this.rows[this.rows.length - 1] = row;
      return;
    }
    if (last !== undefined && row.t - last.t > GAP_ms) this.rows.push(unknownRow(last.t + ROW_ms));
    this.rows.push(row);
    if (this.rows[0] !== undefined && row.t - this.rows[0].t > TRACK_ms + 60_000) {
      this.rows = this.rows.filter((kept) => row.t - kept.t <= TRACK_ms);
    }
  }

  /** Takes the record's answer for the time before the live rows. */
  remember(answer: SeriesJson): void {
    const past = rowsOf(answer);
    const until = past[past.length - 1]?.t ?? 0;
    this.rows = [...past, ...this.rows.filter((row) => row.t > until)];
    this.version++;
  }
}

/** Rows of a record's answer: one for every time that any trace has, and one for every gap. */
export function rowsOf(answer: SeriesJson): Row[] {
  const at = new Map<number, Record<string, number>>();
  for (const quantity of QUANTITIES) {
    const trace = answer.channels[RECORDED[quantity]];
    if (trace === undefined) continue;
    trace.t.forEach((t, i) => {
      const row = at.get(t) ?? {};
      row[quantity] = entryOf(quantity, trace, i);
      at.set(t, row);
    });
  }
  for (const gap of answer.gaps) {
    if (gap.to - gap.from > GAP_ms) at.set(gap.from + 1, {});
  }
  const rows = [...at]
    .sort(([a], [b]) => a - b)
    .map(([t, values]) => ({ ...unknownRow(t), ...values }) as Row);
  // Before the first known row there was no bench to know of: nothing, rather than a gap.
  const first = rows.findIndex((row) => !isUnknown(row));
  return first < 0 ? [] : rows.slice(first);
}

/** Codes are never averaged: of several in one entry the highest is taken. */
function entryOf(quantity: Quantity, trace: TraceJson, i: number): number {
  const isCode = quantity === "maker" || quantity === "state";
  return nan((isCode ? trace.max[i] : trace.mean[i]) ?? null);
}
