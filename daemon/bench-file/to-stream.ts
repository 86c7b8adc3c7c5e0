import type { Conversion } from "../model/conversion.ts";
import { parseQuantity } from "../model/quantities.ts";
import type { QuantityKind } from "../model/quantity-units.ts";
import { KINDS } from "../model/quantity-units.ts";
import {
  type CutOff,
  STREAM_COLUMNS_MAX,
  type StreamColumn,
  type StreamSpec,
} from "../model/stream.ts";
import type { Finding, Path } from "./problem.ts";
import type { BenchFile } from "./schema.ts";

type StreamFile = NonNullable<BenchFile["controller"]["stream"]>;
type ColumnFile = StreamFile["columns"][string];

/** A stream and what its columns' numbers mean. */
export interface StreamParts {
  readonly spec: StreamSpec;
  readonly conversions: Readonly<Record<string, Conversion>>;
}

/** Kinds of unit that a printed number may have. */
const PRINTED: readonly QuantityKind[] = [
  "current",
  "temperature",
  "power",
  "voltage",
  "resistance",
  "ratio",
  "count",
];
/** Units in which the judge holds what it judges. */
const JUDGED: Readonly<Record<string, QuantityKind>> = {
  set: "current",
  current: "current",
  case: "temperature",
  photodiode: "power",
};
/** Most that a reading of a kind can be and still be true, in the held unit: wide on purpose. */
const REACH: Partial<Record<QuantityKind, readonly [number, number]>> = {
  temperature: [-100, 300],
};
const REACH_counts = 2_000_000_000;
/** A recorded count, printed: finer than boards print, and four digits more than they mean. */
const STEP = 0.0001;
const UNIT_ms = { ms: 1, s: 1000, us: 0.001 } as const;

const error = (
  path: Path,
  code: string,
  found: string,
  wanted: string,
  advice: string,
): Finding => ({
  level: "error",
  code,
  path: ["controller", ...path],
  found,
  wanted,
  do: advice,
});

/** The stream of a file, or null where its board speaks the line protocol. */
export function streamOf(file: BenchFile, findings: Finding[]): StreamParts | null {
  const { stream } = file.controller;
  if (stream === undefined) {
    if (file.controller["cut-off"] !== undefined) findings.push(CUT_WITHOUT_STREAM);
    return null;
  }
  const conversions: Record<string, Conversion> = Object.create(null);
  const columns: StreamColumn[] = [];
  for (const [channel, column] of Object.entries(stream.columns)) {
    const made = columnOf(file, channel, column, findings);
    if (made === null) continue;
    columns.push(made.column);
    if (made.conversion !== null) conversions[channel] = made.conversion;
  }
  findings.push(...columnFindings(stream));
  const spec: StreamSpec = {
    format: stream.format,
    separator: stream.separator,
    decimals: stream.decimals,
    time:
      stream.time === "none" ? null : { from: stream.time, unit_ms: UNIT_ms[stream["time-unit"]] },
    banner: stream.banner,
    columns,
    cutOff: cutOffOf(file, findings),
  };
  return { spec, conversions };
}

const CUT_WITHOUT_STREAM = error(
  ["cut-off"],
  "cut-off",
  "a cut-off without a stream",
  "a cut-off only for a controller with firmware of its own; a board of the line protocol has its permits",
  "take cut-off out, or add the stream",
);

function columnFindings(stream: StreamFile): Finding[] {
  const findings: Finding[] = [];
  const names = Object.keys(stream.columns);
  const judged = ["current", "case", "photodiode"].some((name) => names.includes(name));
  if (!judged) {
    findings.push(
      error(
        ["stream", "columns"],
        "nothing-judged",
        names.length === 0 ? "no columns" : `only ${names.slice(0, 5).join(", ")}`,
        "at least one of current, case, photodiode, or there is nothing to watch",
        "name the column that is the current, the case temperature or the light",
      ),
    );
  }
  if (names.length > STREAM_COLUMNS_MAX) {
    findings.push(
      error(
        ["stream", "columns"],
        "columns-many",
        `${names.length} columns`,
        `at most ${STREAM_COLUMNS_MAX}`,
        "leave out what nobody looks at",
      ),
    );
  }
  if (stream.format === "csv") {
    const froms: [string, Path][] = Object.entries(stream.columns).map(([name, { from }]) => [
      from,
      ["stream", "columns", name, "from"],
    ]);
    if (stream.time !== "none") froms.push([stream.time, ["stream", "time"]]);
    for (const [from, path] of froms) {
      if (/^[1-9]\d?$/.test(from)) continue;
      const wanted = "the column's place in the line, from 1: headings are missed as often as not";
      findings.push(error(path, "place", from, wanted, "count the columns from the left"));
    }
    if (stream.separator === "comma" && stream.decimals === "comma") {
      const wanted = "another separator where decimals are written with a comma";
      const at = ["stream", "separator"];
      findings.push(error(at, "separator", "comma for both", wanted, "write semicolon or tab"));
    }
  }
  return findings;
}

interface MadeColumn {
  readonly column: StreamColumn;
  readonly conversion: Conversion | null;
}

function columnOf(
  file: BenchFile,
  channel: string,
  column: ColumnFile,
  findings: Finding[],
): MadeColumn | null {
  const path = ["stream", "columns", channel];
  const printed = printedUnit(column.unit);
  if (printed === null) {
    const wanted = "a unit such as A, mA, °C, mW, V, %, or counts for a number without one";
    findings.push(
      error(
        [...path, "unit"],
        "unit",
        column.unit,
        wanted,
        "write the unit in exactly these letters",
      ),
    );
    return null;
  }
  const held = heldOf(column, printed, path, findings);
  const wanted = JUDGED[channel];
  const law = file.channels?.[channel];
  if (printed.kind === "count") {
    if (wanted !== undefined && law === undefined) {
      findings.push(
        error(
          [...path, "unit"],
          "unit",
          "counts",
          `${KINDS[wanted].name}, or a law under channels.${channel}`,
          `write the printed unit, or add channels.${channel} with the law of the sensor`,
        ),
      );
    }
  } else if (wanted !== undefined && held.kind !== wanted) {
    const advice =
      channel === "photodiode"
        ? "add feedback and responsivity, or call the channel photodiode-raw: it is then recorded and not judged"
        : `write a unit of ${KINDS[wanted].name}, or add what makes one of it (shunt)`;
    findings.push(
      error([...path, "unit"], "unit", KINDS[held.kind].name, KINDS[wanted].name, advice),
    );
  } else if (law !== undefined) {
    findings.push(
      error(
        [...path, "unit"],
        "law",
        `${column.unit}, and a law under channels.${channel} as well`,
        "one of the two: a printed unit, or counts with a law",
        `write counts here, or take channels.${channel} out`,
      ),
    );
  }
  return recorded(channel, column, held, fullOf(law));
}

/** Counts of a full divider, where the channel's law has one. */
function fullOf(law: NonNullable<BenchFile["channels"]>[string] | undefined): number | null {
  return law?.ntc?.full ?? law?.["steinhart-hart"]?.full ?? law?.platinum?.full ?? null;
}

function recorded(
  channel: string,
  column: ColumnFile,
  held: Held,
  full_counts: number | null,
): MadeColumn {
  const isCount = held.kind === "count";
  const step = column.step ?? (isCount ? 1 : STEP);
  const perCount = step * held.perPrinted;
  const reach = REACH[held.kind];
  const ends = reach?.map((value) => (value - held.offset) / perCount) ?? [
    isCount && full_counts !== null ? 0 : -REACH_counts,
    isCount && full_counts !== null ? full_counts : REACH_counts,
  ];
  const spec: StreamColumn = {
    channel,
    from: column.from,
    unit: isCount ? "counts" : KINDS[held.kind].held,
    step,
    perCount: isCount ? 1 : perCount,
    count_min: Math.max(-REACH_counts, Math.round(Math.min(...ends))),
    count_max: Math.min(REACH_counts, Math.round(Math.max(...ends))),
  };
  if (isCount) return { column: spec, conversion: null };
  const law = { kind: "linear" as const, perCount, offset: held.offset };
  const stated = Math.abs(Number(column.error) * held.perPrinted);
  return { column: spec, conversion: { version: 1, law, error: stated } };
}

interface PrintedUnit {
  readonly kind: QuantityKind;
  readonly times: number;
}

/** What a unit stands for, with the held units in one of it; null where it is none. */
function printedUnit(unit: string): PrintedUnit | null {
  for (const kind of PRINTED) {
    const parsed = parseQuantity(kind, `1 ${unit}`);
    if (parsed.ok) return { kind, times: parsed.value };
  }
  return null;
}

interface Held {
  readonly kind: QuantityKind;
  /** Held units in one printed one, and what is added, in held units. */
  readonly perPrinted: number;
  readonly offset: number;
}

/** A voltage over a shunt is a current; one behind a photodiode's feedback resistor is a power. */
function heldOf(column: ColumnFile, printed: PrintedUnit, path: Path, findings: Finding[]): Held {
  const { shunt, feedback, responsivity, scale, offset } = column;
  const perPrinted = scale * printed.times;
  const offset_held = offset * printed.times;
  const plain: Held = { kind: printed.kind, perPrinted, offset: offset_held };
  if (scale === 0) {
    const wanted = "what a printed one stands for";
    findings.push(
      error([...path, "scale"], "range", "zero", wanted, "write the scale, or leave it out"),
    );
    return { ...plain, perPrinted: printed.times };
  }
  if (shunt === undefined && feedback === undefined && responsivity === undefined) return plain;
  const both = feedback !== undefined && responsivity !== undefined;
  if (printed.kind !== "voltage" || (shunt === undefined) === !both) {
    findings.push(
      error(
        [...path, "unit"],
        "law",
        printed.kind === "voltage" ? "half a law, or two" : KINDS[printed.kind].name,
        "a voltage, with shunt alone, or with feedback and responsivity together",
        "write V or mV, and the one law that fits",
      ),
    );
    return plain;
  }
  const ohm = shunt ?? (feedback ?? 1) * (responsivity ?? 1);
  const kind = shunt === undefined ? "power" : "current";
  return { kind, perPrinted: perPrinted / ohm, offset: offset_held / ohm };
}

function cutOffOf(file: BenchFile, findings: Finding[]): CutOff | null {
  const cut = file.controller["cut-off"];
  if (cut === undefined) return null;
  const refuse = (key: string, found: string, wanted: string, advice: string): void => {
    findings.push(error(["cut-off", key], "cut-off", found, wanted, advice));
  };
  if (cut.kind === "text") {
    if (cut.send === "") refuse("send", "nothing", "the text that cuts the light", "add send");
    if (cut.expect === "") {
      refuse(
        "expect",
        "nothing",
        "what the controller answers, or nobody knows that it heard",
        "add expect",
      );
    }
    return { kind: "text", send: cut.send, expect: cut.expect, within_ms: cut.within };
  }
  if (file.controller.connect.kind !== "serial") {
    refuse(
      "kind",
      cut.kind,
      "a serial port, which alone has such a line",
      "use a text, or a serial port",
    );
  }
  if (cut.mode === "static" && cut["asserted-means"] === "light") {
    refuse(
      "asserted-means",
      "light",
      "cut: opening the port asserts the line, and whatever opens it must darken",
      "wire it so that the asserted line cuts, or feed a one-shot (mode: toggled)",
    );
  }
  const names = Object.keys(file.controller.stream?.columns ?? {});
  if (cut.mode === "toggled" && !(names.includes("current") && names.includes("case"))) {
    refuse(
      "mode",
      "toggled without both current and case",
      "the columns current and case, on which the judge decides whether to toggle",
      "add the columns, or use mode: static",
    );
  }
  return { kind: "line", line: cut.kind, mode: cut.mode };
}
