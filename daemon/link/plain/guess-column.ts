import { type Role, roleOf, splitName, type UnitWords, unitOf } from "./roles.ts";
import type { FoundColumn } from "./shapes.ts";

/** What one column probably is. Under `SURE` it is not said to be anything: recorded, not judged. */
export interface GuessedColumn {
  /** Name in the stream; `column 2` where it has none. */
  readonly name: string;
  readonly from: string;
  readonly channel: string;
  /** Unit as a bench file writes it; empty where undecided. */
  readonly unit: string;
  readonly scale: number;
  readonly offset: number;
  /** Smallest step that was printed. */
  readonly step: number;
  /** 0 to 1. */
  readonly confidence: number;
  /** Why nobody can say, in a sentence; empty where it is said. */
  readonly doubt: string;
}

/** From here on a guess is proposed as a unit. */
export const SURE = 0.6;
const BY_NAME_AND_UNIT = 0.95;
const BY_UNIT = 0.75;
const BY_SIZE = 0.65;
const UNKNOWN = 0.2;

/** Between these a reading on a laser bench is plausible, in the unit that the bench file writes. */
const PLAUSIBLE: Readonly<Record<string, readonly [number, number]>> = {
  A: [-1, 100],
  mA: [-1000, 100_000],
  uA: [-1e6, 1e8],
  "°C": [-60, 200],
  W: [-1, 100],
  mW: [-1000, 100_000],
  uW: [-1e6, 1e8],
  V: [-100, 100],
  mV: [-100_000, 100_000],
  "%": [-1, 110],
};

const UNIT_ALONE: Readonly<Record<string, string>> = {
  current: "current",
  temperature: "case",
  power: "photodiode",
  voltage: "forward",
  ratio: "humidity",
};

interface Facts {
  readonly min: number;
  readonly max: number;
  readonly whole: boolean;
}

function factsOf(values: readonly number[]): Facts {
  let min = Number.POSITIVE_INFINITY;
  let max = Number.NEGATIVE_INFINITY;
  let whole = true;
  for (const value of values) {
    if (!Number.isFinite(value)) continue;
    min = Math.min(min, value);
    max = Math.max(max, value);
    whole &&= Number.isInteger(value);
  }
  return { min, max, whole };
}

/** Guesses one column by its name, the unit behind its numbers or in its name, and its values. */
export function guessColumn(column: FoundColumn): GuessedColumn {
  const split = splitName(column.name);
  const role = roleOf(split.name) ?? roleOf(column.name);
  const printed = column.unit === "" ? null : unitOf(column.unit);
  const unit = printed ?? split.unit;
  const name = column.name === "" ? `column ${column.from}` : column.name;
  const facts = factsOf(column.values);
  const step = stepOf(column.values);
  const base = { name, from: column.from, step };
  if (!(facts.min <= facts.max)) return unknown(base, slug(name), `${name} never gave a reading`);
  if (unit !== null && (role === null || role.kind === unit.kind)) {
    return withUnit(base, role, unit, facts);
  }
  if (unit !== null && role !== null) {
    // A light that is given in volts is a reading all the same, but no power.
    const why = `${name} is named as ${role.channel} and given in ${unit.unit}`;
    return unknown(base, `${role.channel}-raw`, `${why}; say what one ${unit.unit} stands for`);
  }
  if (role === null) {
    const words = `${name} reads ${span(facts)} and says neither what it is nor its unit`;
    return unknown(base, slug(name), words);
  }
  return bySize(base, role, facts);
}

type Base = Pick<GuessedColumn, "name" | "from" | "step">;

function withUnit(base: Base, role: Role | null, unit: UnitWords, facts: Facts): GuessedColumn {
  const channel = role?.channel ?? UNIT_ALONE[unit.kind] ?? slug(base.name);
  const low = facts.min * unit.scale + unit.offset;
  const high = facts.max * unit.scale + unit.offset;
  const [least, most] = PLAUSIBLE[unit.unit] ?? [-1e9, 1e9];
  if (low < least || high > most) {
    const words = `${base.name} says ${unit.unit} and reads ${span(facts)}, which no bench like this does`;
    return unknown(base, `${channel}-raw`, `${words}; another unit, or raw counts`);
  }
  const confidence = role === null ? BY_UNIT : BY_NAME_AND_UNIT;
  const { scale, offset } = unit;
  return { ...base, channel, unit: unit.unit, scale, offset, confidence, doubt: "" };
}

/** The role is known and no unit is given: the size of the values may tell. */
function bySize(base: Base, role: Role, facts: Facts): GuessedColumn {
  const unit = sizedUnit(role.kind, facts);
  if (unit === "") {
    const words = `${base.name} reads ${span(facts)} without a unit`;
    return unknown(base, `${role.channel}-raw`, `${words}: ${choices(role.kind)}`);
  }
  const { channel } = role;
  return { ...base, channel, unit, scale: 1, offset: 0, confidence: BY_SIZE, doubt: "" };
}

function sizedUnit(kind: Role["kind"], { min, max, whole }: Facts): string {
  if (kind === "current" && !whole && min >= -0.2) return max <= 10 ? "A" : max > 50 ? "mA" : "";
  if (kind === "temperature" && !whole && min >= 5 && max <= 65) return "°C";
  if (kind === "voltage" && !whole && min >= 0 && max <= 50) return "V";
  return "";
}

function choices(kind: Role["kind"]): string {
  switch (kind) {
    case "current":
      return "A, mA or raw counts";
    case "temperature":
      return "°C, °F, K or raw counts";
    case "power":
      return "W, mW, V of a photodiode or raw counts";
    case "voltage":
      return "V, mV or raw counts";
    default:
      return "its unit is not to be told";
  }
}

const unknown = (base: Base, channel: string, doubt: string): GuessedColumn => ({
  ...base,
  channel,
  unit: "",
  scale: 1,
  offset: 0,
  confidence: UNKNOWN,
  doubt: `${doubt.charAt(0).toUpperCase()}${doubt.slice(1)}.`,
});

const span = ({ min, max }: Facts): string => (min === max ? String(min) : `${min} to ${max}`);

/** A name as a channel of the record: letters, digits and dashes. */
export function slug(name: string): string {
  const plain = name
    .toLowerCase()
    .replace(/[^a-z0-9]+/g, "-")
    .replace(/^[^a-z]+|-+$/g, "")
    .slice(0, 28);
  return plain === "" ? "column" : plain;
}

/** Decimals that were printed, at most six, as a step. */
function stepOf(values: readonly number[]): number {
  let digits = 0;
  for (const value of values) {
    const text = Number.isFinite(value) ? String(value) : "";
    const at = text.indexOf(".");
    if (at >= 0 && !text.includes("e")) digits = Math.max(digits, text.length - at - 1);
  }
  return 10 ** -Math.min(6, digits);
}
