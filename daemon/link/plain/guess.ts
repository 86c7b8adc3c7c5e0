import type { SeparatorName, StreamFormat } from "../../model/stream.ts";
import { type GuessedColumn, guessColumn, SURE } from "./guess-column.ts";
import { type Decimals, isDamaged, mendSigns } from "./numbers.ts";
import { roleOf } from "./roles.ts";
import {
  cellShape,
  type FoundColumn,
  type HeardLine,
  jsonShape,
  keyedShape,
  labelledShape,
  type Shape,
} from "./shapes.ts";

export type { GuessedColumn } from "./guess-column.ts";
export type { HeardLine } from "./shapes.ts";

/** What a stream probably is, and what nobody can say of it without asking its owner. */
export interface Guess {
  /** Null where no shape explains enough of the lines. */
  readonly format: StreamFormat | null;
  readonly separator: SeparatorName;
  readonly decimals: Decimals;
  /** The stream's own time. */
  readonly time: { readonly from: string; readonly unit: "ms" | "s" | "us" } | null;
  /** Readings a second, rounded down to what the bench file may ask for. */
  readonly rate_perS: number;
  readonly columns: readonly GuessedColumn[];
  readonly undecided: readonly string[];
  /** Share of the lines that the format explains. */
  readonly share: number;
}

/** A format explains at least this share of the lines; the rest are banners and debug text. */
const SHARE_MIN = 0.4;
/** Fewer lines tell nothing. */
const LINES_MIN = 4;
/** Lines damaged beyond this share are a wrong baud rate. */
const DAMAGED_MAX = 0.5;

/**
 * Guesses format, columns and units of lines heard. The first line is left out, since it may be torn.
 * Deterministic: the same lines give the same guess.
 */
export function guessStream(heard: readonly HeardLine[]): Guess {
  const whole = heard.slice(1);
  if (whole.some(({ line }) => /^<(hello|sample|boot) /.test(line))) {
    return none("This board speaks the line protocol: leave stream out of the bench file.");
  }
  const lines = whole
    .filter(({ line }) => !isDamaged(line))
    .map(({ line, at_ms }) => ({ line: mendSigns(line), at_ms }));
  if (whole.length - lines.length > whole.length * DAMAGED_MAX) {
    const bad = whole.length - lines.length;
    return none(`${bad} of ${whole.length} lines are damaged: the baud rate is probably another.`);
  }
  if (lines.length < LINES_MIN) {
    return none(`Only ${lines.length} whole lines came; listen longer.`);
  }
  const twice = commaForBoth(lines);
  if (twice !== "") return none(twice);
  const shape = bestShape(lines);
  if (shape === null || shape.columns.length === 0) {
    return none("No shape explains the lines: neither columns, keys, JSON nor labels.");
  }
  return fromShape(shape);
}

const none = (why: string): Guess => ({
  format: null,
  separator: "comma",
  decimals: "point",
  time: null,
  rate_perS: 0,
  columns: [],
  undecided: [why],
  share: 0,
});

/** A heading with half as many names as there are numbers: decimals and columns share the comma. */
function commaForBoth(lines: readonly HeardLine[]): string {
  const widths = lines
    .filter(({ line }) => /^[\d,+-]+$/.test(line))
    .map((l) => l.line.split(",").length);
  const width = widths[0] ?? 0;
  if (width < 4 || width % 2 !== 0 || widths.some((one) => one !== width)) return "";
  const half = lines.some(({ line }) => {
    const cells = line.split(",");
    return cells.length === width / 2 && cells.every((cell) => /[A-Za-z]/.test(cell));
  });
  const words = "decimals are written with a comma, and so are columns parted";
  const advice = "let the board print a point, or a semicolon between columns";
  return half ? `It looks as if ${words}: ${advice}.` : "";
}

const SEPARATORS: readonly SeparatorName[] = ["tab", "semicolon", "bar", "comma", "space"];

function bestShape(lines: readonly HeardLine[]): Shape | null {
  const decimals = usesComma(lines) ? "comma" : "point";
  const cells = SEPARATORS.flatMap((separator) => [
    cellShape(lines, separator, "point"),
    ...(separator === "comma" ? [] : [cellShape(lines, separator, "comma")]),
  ]).sort((a, b) => b.share - a.share || b.columns.length - a.columns.length);
  const shapes = [
    jsonShape(lines),
    ...cells,
    keyedShape(lines, decimals),
    labelledShape(lines, decimals),
  ];
  return shapes.find(({ share, columns }) => share >= SHARE_MIN && columns.length > 0) ?? null;
}

/** Numbers with a comma and none with a point. */
const usesComma = (lines: readonly HeardLine[]): boolean =>
  lines.some(({ line }) => /\d,\d/.test(line)) && !lines.some(({ line }) => /\d\.\d/.test(line));

function fromShape(shape: Shape): Guess {
  const time = timeOf(shape.columns);
  const rest = shape.columns.filter((column) => column.from !== time?.from);
  const columns = distinct(rest.map(guessColumn));
  const undecided = columns.filter(({ confidence }) => confidence < SURE).map((c) => c.doubt);
  if (shape.format === "csv" && shape.separator === "comma" && allWhole(shape.columns)) {
    const words = "Every number is whole, and columns are parted by commas";
    if (shape.columns.length >= 4 && shape.columns.every(({ name }) => name === "")) {
      undecided.push(`${words}: if decimals are written with a comma too, the columns are wrong.`);
    }
  }
  const judged = columns.some(({ channel }) => /^(current|case|photodiode)$/.test(channel));
  if (!judged) {
    undecided.push("None of the columns is surely current, case temperature or light: name one.");
  }
  const { format, separator, decimals, share } = shape;
  const rate_perS = rateOf(shape.columns[0]);
  return { format, separator, decimals, time, rate_perS, columns, undecided, share };
}

const allWhole = (columns: readonly FoundColumn[]): boolean =>
  columns.every(({ values }) => values.every((value) => Number.isInteger(value)));

/** Two columns cannot be one channel: the surer one, or the first, keeps the name. */
function distinct(columns: readonly GuessedColumn[]): GuessedColumn[] {
  const taken = new Map<string, number>();
  return columns.map((column) => {
    const count = (taken.get(column.channel) ?? 0) + 1;
    taken.set(column.channel, count);
    return count === 1 ? column : { ...column, channel: `${column.channel}-${count}` };
  });
}

/** How much a clock in the stream may run off the time at which lines are read. */
const CLOCK_RATIO = 1.5;

/** The column that goes up as time does, in a unit that fits the moments of reading. */
function timeOf(columns: readonly FoundColumn[]): Guess["time"] {
  for (const { from, name, values, at_ms } of columns) {
    if (!mayBeTime(name) || !ascends(values)) continue;
    const perMs = ascentPer_ms(values, at_ms);
    for (const [unit, each] of [
      ["ms", 1],
      ["s", 0.001],
      ["us", 1000],
    ] as const) {
      const ratio = perMs / each;
      if (ratio < CLOCK_RATIO && ratio > 1 / CLOCK_RATIO) return { from, unit };
    }
  }
  return null;
}

const mayBeTime = (name: string): boolean => {
  const role = roleOf(name);
  return name === "" || role === null || role.kind === "time" || /^t$/i.test(name);
};

/** Up at every line but where the controller started anew. */
function ascends(values: readonly number[]): boolean {
  let back = 0;
  for (let i = 1; i < values.length; i += 1) {
    const step = (values[i] ?? 0) - (values[i - 1] ?? 0);
    if (!(step >= 0)) back += 1;
    if (Number.isNaN(step)) return false;
  }
  const first = values[0] ?? 0;
  return back <= values.length / 10 && values.some((value) => value !== first);
}

/** Ascent for each millisecond of reading: the middle of all steps, so that a restart counts little. */
function ascentPer_ms(values: readonly number[], at_ms: readonly number[]): number {
  let up = 0;
  let span_ms = 0;
  for (let i = 1; i < values.length; i += 1) {
    const step = (values[i] ?? 0) - (values[i - 1] ?? 0);
    if (step < 0) continue;
    up += step;
    span_ms += (at_ms[i] ?? 0) - (at_ms[i - 1] ?? 0);
  }
  return span_ms > 0 ? up / span_ms : Number.NaN;
}

const RATE_MAX_perS = 1000;

/** Readings a second, down to two digits, so that a bench file does not ask for more than comes. */
function rateOf(column: FoundColumn | undefined): number {
  const at_ms = column?.at_ms ?? [];
  const span_ms = (at_ms[at_ms.length - 1] ?? 0) - (at_ms[0] ?? 0);
  if (!(span_ms > 0)) return 1;
  const rate = ((at_ms.length - 1) * 1000) / span_ms;
  const digits = 10 ** Math.max(0, Math.floor(Math.log10(rate)) - 1);
  return Math.min(RATE_MAX_perS, Math.max(1, Math.round(rate / digits) * digits));
}
