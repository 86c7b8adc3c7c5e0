import { SEPARATORS, type SeparatorName, type StreamFormat } from "../../model/stream.ts";
import { type Decimals, numberPattern, readPrinted } from "./numbers.ts";
import { UNIT_PATTERN } from "./roles.ts";

/** The shapes in which lines may carry numbers: each tried, and how much of the lines it explains. */

/** One column as found: its values in line order (NaN for no reading) and the unit behind them. */
export interface FoundColumn {
  /** What the bench file writes as `from`. */
  readonly from: string;
  /** Name that people gave it; empty where nobody did. */
  readonly name: string;
  readonly unit: string;
  readonly values: readonly number[];
  /** Moments at which they were read, ms. */
  readonly at_ms: readonly number[];
}

export interface Shape {
  readonly format: StreamFormat;
  readonly separator: SeparatorName;
  readonly decimals: Decimals;
  readonly columns: readonly FoundColumn[];
  /** Share of the lines that it explains. */
  readonly share: number;
}

export interface HeardLine {
  readonly line: string;
  readonly at_ms: number;
}

class Gathered {
  private readonly columns = new Map<
    string,
    { name: string; unit: string; values: number[]; at_ms: number[] }
  >();

  put(from: string, name: string, unit: string, value: number, at_ms: number): void {
    const known = this.columns.get(from) ?? { name, unit, values: [], at_ms: [] };
    if (known.unit === "") known.unit = unit;
    known.values.push(value);
    known.at_ms.push(at_ms);
    this.columns.set(from, known);
  }

  /** Columns that come often enough to be part of every reading. */
  often(): FoundColumn[] {
    const most = Math.max(0, ...[...this.columns.values()].map((c) => c.values.length));
    return [...this.columns]
      .filter(([, column]) => column.values.length >= most * 0.6)
      .map(([from, column]) => ({ from, ...column }));
  }
}

/** Objects, one a line. Numbers within objects are found by their dotted way. */
export function jsonShape(lines: readonly HeardLine[]): Shape {
  const found = new Gathered();
  let explained = 0;
  for (const { line, at_ms } of lines) {
    const leaves = leavesOf(parsed(line), "");
    if (leaves.length > 0) explained += 1;
    for (const [way, value] of leaves)
      found.put(way, way.split(".").at(-1) ?? way, "", value, at_ms);
  }
  return shape("json", "comma", "point", found, explained, lines);
}

function parsed(line: string): unknown {
  if (!line.trim().startsWith("{")) return null;
  try {
    return JSON.parse(line);
  } catch {
    // No object: a torn line, or words that begin with a bracket.
    return null;
  }
}

function leavesOf(value: unknown, way: string): [string, number][] {
  if (typeof value === "number") return way === "" ? [] : [[way, value]];
  if (typeof value === "string" && way !== "") {
    const printed = readPrinted(value, "point");
    return printed === null ? [] : [[way, printed.value]];
  }
  if (value === null && way !== "") return [[way, Number.NaN]];
  if (typeof value !== "object" || value === null || Array.isArray(value)) return [];
  return Object.entries(value).flatMap(([key, part]) =>
    leavesOf(part, way === "" ? key : `${way}.${key}`),
  );
}

/** `I=1.52 T: 31.4 C`: keys of letters, an equals sign or colon, a number, perhaps its unit. */
export function keyedShape(lines: readonly HeardLine[], decimals: Decimals): Shape {
  const pattern = new RegExp(
    `([A-Za-z][A-Za-z0-9_./ -]{0,30}?)\\s*[=:]\\s*(${numberPattern(decimals)}|nan|inf|ovf)(?![\\d])\\s?(?:(${UNIT_PATTERN})(?![A-Za-z0-9_]|\\s*[=:]))?`,
    "gi",
  );
  return namedShape("key-value", lines, decimals, pattern);
}

/** Words between a label and its number. */
const FILLERS = /^(?:and|with|the|now|is|at|of|reads?|a)\s+/i;

/** `laser current is 1.52 A, case temperature 31.4 C`: a label, filler words, a number with a unit. */
export function labelledShape(lines: readonly HeardLine[], decimals: Decimals): Shape {
  const pattern = new RegExp(
    `([A-Za-z][A-Za-z_ -]{0,40}?)(?:\\s+(?:is|at|of|reads?|now|=))?[\\s:=]+(${numberPattern(decimals)})(?![\\d])\\s?(?:(${UNIT_PATTERN})(?![A-Za-z0-9_]))?`,
    "g",
  );
  return namedShape("labelled", lines, decimals, pattern);
}

function namedShape(
  format: "key-value" | "labelled",
  lines: readonly HeardLine[],
  decimals: Decimals,
  pattern: RegExp,
): Shape {
  const found = new Gathered();
  let explained = 0;
  for (const { line, at_ms } of lines) {
    let any = false;
    for (const match of line.matchAll(pattern)) {
      let key = (match[1] ?? "").trim();
      while (FILLERS.test(key)) key = key.replace(FILLERS, "");
      const printed = readPrinted(match[2] ?? "", decimals);
      if (key === "" || printed === null) continue;
      found.put(key, key, match[3] ?? "", printed.value, at_ms);
      any = true;
    }
    if (any) explained += 1;
  }
  return shape(format, "space", decimals, found, explained, lines);
}

/** Cells parted by one sign, all of them numbers; a heading before them gives their names. */
export function cellShape(
  lines: readonly HeardLine[],
  separator: SeparatorName,
  decimals: Decimals,
): Shape {
  const rows = lines.map(({ line, at_ms }) => ({ cells: cellsOf(line, separator), at_ms }));
  const isRow = (cells: readonly string[]): boolean =>
    cells.some((cell) => /\d/.test(cell)) &&
    cells.every((cell) => readPrinted(cell, decimals) !== null);
  const width = commonest(
    rows.filter(({ cells }) => isRow(cells)).map(({ cells }) => cells.length),
  );
  const heading = rows.find(
    ({ cells }) =>
      cells.length === width &&
      cells.every((cell) => readPrinted(cell, decimals) === null && /[A-Za-z]/.test(cell)),
  );
  const found = new Gathered();
  let explained = 0;
  for (const { cells, at_ms } of rows) {
    if (cells.length !== width || !isRow(cells)) continue;
    explained += 1;
    for (const [i, cell] of cells.entries()) {
      const printed = readPrinted(cell, decimals);
      const name = heading?.cells[i]?.trim() ?? "";
      if (printed !== null) found.put(String(i + 1), name, printed.unit, printed.value, at_ms);
    }
  }
  return shape("csv", separator, decimals, found, width === 0 ? 0 : explained, lines);
}

function cellsOf(line: string, separator: SeparatorName): string[] {
  const plain = line.trim();
  return separator === "space" ? plain.split(/\s+/) : plain.split(SEPARATORS[separator]);
}

function commonest(widths: readonly number[]): number {
  const counts = new Map<number, number>();
  for (const width of widths) counts.set(width, (counts.get(width) ?? 0) + 1);
  return [...counts].sort((a, b) => b[1] - a[1])[0]?.[0] ?? 0;
}

const shape = (
  format: StreamFormat,
  separator: SeparatorName,
  decimals: Decimals,
  found: Gathered,
  explained: number,
  lines: readonly HeardLine[],
): Shape => ({
  format,
  separator,
  decimals,
  columns: found.often(),
  share: lines.length === 0 ? 0 : explained / lines.length,
});
