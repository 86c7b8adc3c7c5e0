import { SEPARATORS, type StreamSpec } from "../../model/stream.ts";
import { isDamaged, mendSigns, NO_READING_PATTERN, numberPattern, readPrinted } from "./numbers.ts";

/**
 * What a line is. values: every column; some: not all of them; text: words without any column, such
 * as a banner, a heading or debug output; half: fewer cells than it must have; broken: damaged.
 */
export type LineKind = "values" | "some" | "text" | "half" | "broken";

/** Stands before and after a key, so that T is not found in PT. */
const BEFORE = "(?<![A-Za-z0-9_])";
/** After a number no more digits, and no key at once: two lines may have run into each other. */
const AFTER = "(?![.,]?\\d)(?![A-Za-z_]+\\s*[=:])";
const literally = (text: string): string => text.replace(/[.*+?^${}()|[\]\\]/g, "\\$&");

/**
 * Reads lines of one stream into one value a column. Values are printed numbers, not yet counts:
 * NaN where the controller itself says that it has no reading. Never throws.
 */
export class StreamReader {
  /** Values of the columns, in the order of the specification; the time, where there is one, last. */
  readonly values: Float64Array;
  /** 1 where the line read last brought the column. */
  readonly found: Uint8Array;
  private readonly spec: StreamSpec;
  private readonly names: readonly string[];
  private readonly patterns: readonly RegExp[];
  private readonly places: readonly number[];
  private readonly cells_min: number;

  constructor(spec: StreamSpec) {
    this.spec = spec;
    const names = spec.columns.map((column) => column.from);
    this.names = spec.time === null ? names : [...names, spec.time.from];
    this.values = new Float64Array(this.names.length);
    this.found = new Uint8Array(this.names.length);
    this.patterns = this.names.map((name) => this.patternOf(name));
    this.places = this.names.map((name) => Number(name) - 1);
    this.cells_min = Math.max(0, ...this.places) + 1;
  }

  /** Reads one line into `values` and `found`. */
  read(line: string): LineKind {
    this.found.fill(0);
    if (isDamaged(line)) return "broken";
    switch (this.spec.format) {
      case "csv":
        return this.readCells(line);
      case "json":
        return this.readJson(line);
      default:
        return this.readNamed(mendSigns(line));
    }
  }

  private patternOf(name: string): RegExp {
    const number = numberPattern(this.spec.decimals);
    const value = `(${number}|(?:${NO_READING_PATTERN})(?![A-Za-z]))`;
    const between =
      this.spec.format === "labelled" ? "[^0-9+\\-.,;]{0,24}?[\\s:=]" : "\\s*[=:]\\s*";
    return new RegExp(`${BEFORE}${literally(name)}${between}${value}${AFTER}`, "g");
  }

  private readCells(line: string): LineKind {
    const { separator, decimals } = this.spec;
    const cells =
      separator === "space" ? line.trim().split(/\s+/) : line.split(SEPARATORS[separator]);
    let read = 0;
    for (const [i, place] of this.places.entries()) {
      const printed = readPrinted(cells[place] ?? "x", decimals);
      if (printed === null) continue;
      this.put(i, printed.value);
      read += 1;
    }
    if (read === 0) return "text";
    if (cells.length < this.cells_min) return "half";
    return read === this.places.length ? "values" : "broken";
  }

  private readJson(line: string): LineKind {
    const text = line.trim();
    if (!text.startsWith("{")) return text.includes("{") || text.endsWith("}") ? "half" : "text";
    let value: unknown;
    try {
      value = JSON.parse(text);
    } catch {
      // Cut off, or two lines run into each other: counted, and never read in part.
      return text.endsWith("}") ? "broken" : "half";
    }
    for (const [i, name] of this.names.entries()) {
      const at = valueAt(value, name);
      if (typeof at === "number") this.put(i, at);
      else if (at === null) this.put(i, Number.NaN);
      else if (typeof at === "string") {
        const printed = readPrinted(at, this.spec.decimals);
        if (printed !== null) this.put(i, printed.value);
      }
    }
    return this.kindOfFound();
  }

  private readNamed(line: string): LineKind {
    for (const [i, pattern] of this.patterns.entries()) {
      pattern.lastIndex = 0;
      const first = pattern.exec(line);
      if (first === null) continue;
      // The same key twice is two lines that ran into each other: neither can be trusted.
      if (pattern.exec(line) !== null) return this.broken();
      const printed = readPrinted(first[1] ?? "", this.spec.decimals);
      if (printed !== null) this.put(i, printed.value);
    }
    return this.kindOfFound();
  }

  private broken(): LineKind {
    this.found.fill(0);
    return "broken";
  }

  private put(column: number, value: number): void {
    this.values[column] = value;
    this.found[column] = 1;
  }

  private kindOfFound(): LineKind {
    let count = 0;
    for (const one of this.found) count += one;
    if (count === 0) return "text";
    return count === this.found.length ? "values" : "some";
  }
}

/** Value at a dotted way into parsed JSON; undefined where there is none. */
function valueAt(value: unknown, way: string): unknown {
  let at = value;
  for (const key of way.split(".")) {
    if (typeof at !== "object" || at === null || !Object.hasOwn(at, key)) return undefined;
    at = (at as Record<string, unknown>)[key];
  }
  return at;
}
