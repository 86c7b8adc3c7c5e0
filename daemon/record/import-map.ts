import { KINDS, MISSPELT, type Unit } from "../model/quantity-units.ts";
import { CHANNELS_MAX } from "../model/sample.ts";
import { RecordProblem } from "./problem.ts";

/** Where a channel comes from, and what its numbers mean. */
export interface MappedChannel {
  readonly name: string;
  /** Index of the file's column. */
  readonly column: number;
  /** Unit in which the record holds it. */
  readonly unit: string;
  /** Held value = number × times × 10^power. */
  readonly times: number;
  readonly power: number;
}

/** What the columns of a file mean. */
export interface ColumnMap {
  readonly time: number;
  /** Unit behind the time column's name; empty where none stands there. */
  readonly timeUnit: string;
  readonly channels: readonly MappedChannel[];
}

const NAME = /^[a-z][A-Za-z0-9_.-]{0,31}$/;
/** Names that the record makes itself, and columns of our own export that are no channels. */
const OWN = /^(judge\.|link\.|elapsed$|tick$|session$|bench$)/;
const TIME = /^(time|timestamp|date ?time|zeit|stamp)$/i;

interface Entry {
  readonly name: string;
  readonly column: string;
  readonly unit: string;
}

/**
 * The map that a text such as `time=Stamp, current=I set[A], case=#3[degC]` writes; without one,
 * columns named as channels are, `current [mA]`, mean what they say. Throws a RecordProblem.
 */
export function columnMap(text: string | undefined, columns: readonly string[]): ColumnMap {
  const entries = text === undefined ? byNames(columns) : cutMap(text).map(entryOf);
  const time = entries.find((entry) => entry.name === "time");
  if (time === undefined) {
    throw wrong(
      "Nothing says which column is the time.",
      `There are ${listed(columns)}.`,
      "Write --map time=COLUMN,current=COLUMN[A] with the names of your columns.",
    );
  }
  const others = entries.filter((entry) => entry !== time);
  if (others.length === 0 || others.length > CHANNELS_MAX) {
    throw wrong(
      `A session has 1 to ${CHANNELS_MAX} channels.`,
      `${others.length} are mapped; the columns are ${listed(columns)}.`,
      "Write --map time=COLUMN,current=COLUMN[A] with the names of your columns.",
    );
  }
  const names = new Set<string>();
  return {
    time: columnOf(time.column, columns),
    timeUnit: time.unit,
    channels: others.map((entry) => {
      if (names.has(entry.name))
        throw wrong(`${entry.name} stands twice in --map.`, "", "Say it once.");
      names.add(entry.name);
      return channelOf(entry, columns);
    }),
  };
}

const listed = (columns: readonly string[]): string => columns.slice(0, 20).join(", ");

/** Columns whose own names say what they are. */
function byNames(columns: readonly string[]): Entry[] {
  return columns.flatMap((column) => {
    const { name, unit } = cutUnit(column);
    if (TIME.test(name)) return [{ name: "time", column, unit }];
    return NAME.test(name) && !OWN.test(name) && unit !== "" ? [{ name, column, unit }] : [];
  });
}

/** Entries between commas, but for commas in quotes or brackets. */
function cutMap(text: string): string[] {
  return text.match(/(?:"[^"]*"|\[[^\]]*\]|[^,"[\]])+/g)?.map((entry) => entry.trim()) ?? [];
}

function entryOf(text: string): Entry {
  const match = /^([^=]+)=(.+)$/.exec(text);
  const name = match?.[1]?.trim() ?? "";
  if (match === null || !NAME.test(name) || OWN.test(name)) {
    throw wrong(
      `--map has "${text}".`,
      "A channel's name, = and a column are wanted: current=I set[A].",
      "Names begin with a small letter; judge. and link. are the record's own.",
    );
  }
  const { name: column, unit } = cutUnit((match[2] ?? "").trim());
  return { name, column: column.replace(/^"(.*)"$/, "$1"), unit };
}

/** `I set [A]` is the name `I set` in the unit `A`. */
function cutUnit(text: string): { name: string; unit: string } {
  const match = /^(.*?)\s*\[([^\]]*)\]$/.exec(text);
  return { name: (match?.[1] ?? text).trim(), unit: (match?.[2] ?? "").trim() };
}

function columnOf(name: string, columns: readonly string[]): number {
  const number = /^#(\d+)$/.exec(name)?.[1];
  const at =
    number === undefined
      ? columns.findIndex((column) => column === name || cutUnit(column).name === name)
      : Number(number) - 1;
  if (at >= 0 && at < columns.length) return at;
  throw wrong(
    `The file has no column "${name}".`,
    `There are ${listed(columns)}.`,
    "Write the name as the file has it, or #3 for the third.",
  );
}

function channelOf(entry: Entry, columns: readonly string[]): MappedChannel {
  const column = columnOf(entry.column, columns);
  const unit = entry.unit !== "" ? entry.unit : cutUnit(columns[column] ?? "").unit;
  if (unit === "") {
    throw wrong(
      `Nothing says in which unit ${entry.name} is.`,
      `Its column is "${columns[column]}".`,
      `Write it in brackets: ${entry.name}=${entry.column}[mA].`,
    );
  }
  const known = unitNamed(unit);
  if (known === null) return { name: entry.name, column, unit, times: 1, power: 0 };
  return { name: entry.name, column, unit: known.held, times: known.times, power: known.power };
}

/** A unit of the table of quantities, or null for one that is kept as it is written. */
function unitNamed(text: string): (Unit & { held: string }) | null {
  const symbol = MISSPELT[text.toLowerCase()] ?? text;
  for (const { units, held } of Object.values(KINDS)) {
    const unit = units.find((u) => u.symbol === text) ?? units.find((u) => u.symbol === symbol);
    if (unit !== undefined) return { ...unit, held };
  }
  return null;
}

const wrong = (what: string, found: string, remedy: string): RecordProblem =>
  new RecordProblem(what, found, `${remedy} Nothing was changed.`);
