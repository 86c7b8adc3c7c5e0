import { KINDS } from "../model/quantity-units.ts";
import { RecordProblem } from "./problem.ts";

/** How a file's stamps are meant. */
export interface TimeRule {
  /** Zone of stamps that name none: `UTC`, `+01:00`, `Europe/Berlin`; null where none was said. */
  readonly zone: string | null;
  /** Moment from which plain numbers count, wall ms; null where none was said. */
  readonly start_ms: number | null;
  /** Unit of plain numbers; empty where the stamps are dates. */
  readonly unit: string;
}

/** A stamp as civil time, or why it is none. Two where a clock was put back: the hour came twice. */
export type Stamp = { readonly at: readonly number[] } | { readonly bad: string };

const DATE =
  /^(\d{4})-(\d\d)-(\d\d)[T ]+(\d\d):(\d\d)(?::(\d\d)(?:[.,](\d{1,9}))?)?\s*(Z|UTC|[+-]\d\d:?\d\d)?$/i;
const POINTED =
  /^(\d\d)\.(\d\d)\.(\d{4})[T ]+(\d\d):(\d\d)(?::(\d\d)(?:[.,](\d{1,9}))?)?\s*(Z|UTC|[+-]\d\d:?\d\d)?$/i;

/** Plain numbers from here on count from 1970: it is 1973 in milliseconds. */
const EPOCH_ms_MIN = 1e11;
const DAY_ms = 86_400_000;
const SLOT_ms = 900_000;

/** Reads stamps by one rule. */
export class Times {
  readonly #rule: TimeRule;
  readonly #offset: ((utc_ms: number) => number) | null;

  /** Throws a RecordProblem where the zone is none. */
  constructor(rule: TimeRule) {
    this.#rule = rule;
    const zone = rule.zone ?? (/^(utc|z)$/i.test(rule.unit) ? "UTC" : null);
    this.#offset = zone === null ? null : offsetsOf(zone);
  }

  read(cell: string | number | null): Stamp {
    if (cell === null || String(cell).trim() === "") return { bad: "it has no time" };
    const number = typeof cell === "number" ? cell : Number(cell.trim().replace(",", "."));
    if (Number.isFinite(number)) return this.#number(number);
    return this.#date(String(cell).trim());
  }

  #number(number: number): Stamp {
    const unit = KINDS.time.units.find((u) => u.symbol === this.#rule.unit);
    if (unit === undefined) {
      return { bad: `its time ${number} is a plain number; say its unit, time=COLUMN[s]` };
    }
    const ms = number * unit.times * 10 ** unit.power;
    if (this.#rule.start_ms !== null) return { at: [this.#rule.start_ms + ms] };
    if (ms >= EPOCH_ms_MIN) return { at: [ms] };
    return { bad: `its time ${number} counts from a moment that --start must name` };
  }

  #date(text: string): Stamp {
    const iso = DATE.exec(text);
    const pointed = iso === null ? POINTED.exec(text) : null;
    const parts = iso ?? pointed;
    if (parts === null)
      return { bad: `"${text.slice(0, 40)}" is no time like 2026-12-01 22:00:00` };
    const [y, m, d] = iso !== null ? [1, 2, 3] : [3, 2, 1];
    const n = (i: number): number => Number(parts[i] ?? 0);
    const fraction_ms = parts[7] === undefined ? 0 : Number(`0.${parts[7]}`) * 1000;
    const local = Date.UTC(n(y), n(m) - 1, n(d), n(4), n(5), n(6)) + fraction_ms;
    const day = new Date(local);
    if (day.getUTCMonth() !== n(m) - 1 || day.getUTCDate() !== n(d) || n(4) > 23 || n(5) > 59) {
      return { bad: `"${text}" is no day or hour that there is` };
    }
    const zone = parts[8];
    if (zone !== undefined) return { at: [local - fixedOffset(zone)] };
    if (this.#offset === null) return { bad: `"${text}" names no zone; say it with --zone` };
    return inZone(local, this.#offset, text);
  }
}

/** The moments at which a zone's clocks show a local time: none, one, or two. */
function inZone(local: number, offset: (utc_ms: number) => number, text: string): Stamp {
  const offsets = new Set([offset(local - DAY_ms), offset(local + DAY_ms)]);
  const at = [...offsets]
    .map((o) => local - o)
    .filter((t) => offset(t) === local - t)
    .sort((a, b) => a - b);
  return at.length > 0 ? { at } : { bad: `"${text}" was left out by the clocks of that zone` };
}

function fixedOffset(text: string): number {
  const match = /^([+-])(\d\d):?(\d\d)$/.exec(text);
  if (match === null) return 0;
  const minutes = Number(match[2]) * 60 + Number(match[3]);
  return (match[1] === "-" ? -1 : 1) * minutes * 60_000;
}

/** How far a zone's clocks are ahead of UTC, ms, at a moment. */
function offsetsOf(zone: string): (utc_ms: number) => number {
  if (/^(utc|z|[+-]\d\d:?\d\d)$/i.test(zone)) {
    const fixed = fixedOffset(zone);
    return () => fixed;
  }
  const format = formatOf(zone);
  const known = new Map<number, number>();
  return (utc_ms) => {
    // Zones change on quarters of an hour only.
    const slot = Math.floor(utc_ms / SLOT_ms);
    const found = known.get(slot) ?? shownOffset(format, slot * SLOT_ms);
    known.set(slot, found);
    return found;
  };
}

function formatOf(zone: string): Intl.DateTimeFormat {
  try {
    return new Intl.DateTimeFormat("en-GB", {
      timeZone: zone,
      hourCycle: "h23",
      year: "numeric",
      month: "numeric",
      day: "numeric",
      hour: "numeric",
      minute: "numeric",
    });
  } catch {
    // Intl throws for names that it does not know.
    throw new RecordProblem(
      `"${zone}" is no time zone.`,
      "A zone is wanted such as Europe/Berlin, UTC or +01:00.",
      "Write --zone with one of these. Nothing was changed.",
    );
  }
}

function shownOffset(format: Intl.DateTimeFormat, utc_ms: number): number {
  const parts = new Map(
    format.formatToParts(utc_ms).map(({ type, value }) => [type, Number(value)]),
  );
  const of = (type: Intl.DateTimeFormatPartTypes): number => parts.get(type) ?? 0;
  const shown = Date.UTC(of("year"), of("month") - 1, of("day"), of("hour"), of("minute"));
  return shown - utc_ms;
}
