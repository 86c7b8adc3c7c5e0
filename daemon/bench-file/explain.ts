import { type Bench, HAZARD_IDS, type HazardId } from "../model/bench.ts";
import { defaultLevels, HAZARD_ROWS } from "../model/hazard-rows.ts";
import { formatQuantity } from "../model/quantities.ts";
import { LINTS } from "./lints/catalogue.ts";
import { levelWords, REACTION_ms } from "./lints/hazards.ts";
import { PRACTICE } from "./lints/texts.ts";
import { nearest } from "./near.ts";

/** Times for a row's defaults where no bench file is at hand: those of the built-in bench. */
const USUAL = { rate_perS: 50, term_ms: 500, darkTime_ms: 600_000 };

/** Codes of `check` that are no lints: the file could not be read as a bench at that place. */
const READING: Readonly<Record<string, string>> = {
  yaml: "The text is not YAML there. Look at the indent, the colon, the brackets and the quotes.",
  empty: "The file holds nothing. `beamsitter init` writes one to begin with.",
  binary: "The file is no text in UTF-8.",
  "too-large": "The file is larger than any bench file; it is probably a recording.",
  nesting: "Brackets or indents are nested deeper than any bench file needs.",
  alias: "Bench files have no aliases: a value stands in exactly one place.",
  key: "A key must be one plain word.",
  "unknown-key": "No such key is read there; a misspelt one would silently keep its default.",
  missing: "A key without a default is not there.",
  shape: "A single value stands where keys belong, or the other way round.",
  quantity: "A quantity needs its number and its unit, because 1.8 and 1800 look equally right.",
  number: "A plain number without a unit belongs there.",
  range: "The value is far outside what makes sense; mostly its unit is wrong.",
  word: "Only certain words are read there.",
  text: "The text does not have the form that is read there.",
  unit: "The unit is not one of this channel's kind.",
  law: "A channel needs exactly one law that turns counts into its unit.",
  points: "A derating has 2 to 16 points.",
  "cut-off":
    "A cut-off must darken by itself, say that it was heard, and be on a line that it can use.",
  place: "Columns of a csv line are named by their place, from 1.",
  separator: "Decimals and columns cannot both be marked by a comma.",
  "nothing-judged": "A watched bench needs a column that is its current, its case or its light.",
  "columns-many": "A stream maps at most 32 columns; the rest of a line is left alone.",
  date: "A day stands before another that it must follow.",
};

/** Every word that `explain` knows. */
export const explained = (): string[] => [
  ...Object.keys(LINTS),
  ...HAZARD_IDS,
  ...Object.keys(READING),
];

/**
 * What a lint code, another code of `check`, or a hazard row means, in sentences; with a bench, its
 * own levels. An unknown word gives null and the nearest known one.
 */
export function explain(
  word: string,
  bench: Bench | null,
): { readonly lines: string[] } | { readonly lines: null; readonly near: string | null } {
  if (Object.hasOwn(LINTS, word)) {
    const lint = LINTS[word as keyof typeof LINTS];
    return {
      lines: [
        `${word} speaks where ${lint.what}.`,
        `Why: ${lint.why}.`,
        `What to do: ${lint.do}.`,
        `Source: ${lint.source}.`,
      ],
    };
  }
  const row = HAZARD_IDS.find((id) => id === word);
  if (row !== undefined) return { lines: explainRow(row, bench) };
  const reading = Object.hasOwn(READING, word) ? READING[word] : undefined;
  if (reading !== undefined) return { lines: [`${word}: ${reading}`] };
  return { lines: null, near: nearest(word, explained()) };
}

function explainRow(id: HazardId, bench: Bench | null): string[] {
  const row = HAZARD_ROWS[id];
  const levels = bench?.hazards[id] ?? defaultLevels(id, USUAL);
  const { warn, warnDelay_ms, trip, tripDelay_ms, deadband, safety_ms } = levels;
  const whose = bench === null ? "Defaults" : `In the bench file of ${bench.name}`;
  const lines = [`${id} is a row of the hazard table. It watches: ${row.measures}.`];
  if (row.level !== "fact") lines.push(`The danger lies ${row.danger} its levels.`);
  const act = (level: number | null, delay_ms: number, verb: string): string => {
    if (level === null) return `it never ${verb}`;
    const at = row.level === "fact" ? "" : ` at ${levelWords(id, level)}`;
    return `it ${verb}${at} ${delay_ms === 0 ? "at once" : `after ${time(delay_ms)}`}`;
  };
  lines.push(`${whose}: ${act(warn, warnDelay_ms, "warns")}; ${act(trip, tripDelay_ms, "trips")}.`);
  if (row.level !== "fact" && deadband > 0) {
    const kind = row.level === "temperature" ? "difference" : row.level;
    lines.push(`Deadband: ${formatQuantity(kind, deadband, row.level === "ratio" ? 0.001 : 0.1)}.`);
  }
  if (row.follows !== null) lines.push(`Its levels follow from ${row.follows}.`);
  lines.push(detected(row.needs, row.samples));
  lines.push(safetyWords(safety_ms, tripDelay_ms, trip, row.samples));
  lines.push(`Source of the defaults: ${PRACTICE}. A data sheet always wins.`);
  return lines;
}

function detected(needs: readonly string[], samples: number): string {
  const by =
    needs.length === 0
      ? "from the line itself, without a channel"
      : `from the channels ${needs.join(", ")}`;
  const count = samples === 1 ? "one sample is enough" : `${samples} samples must agree`;
  return `Detected ${by}; ${count}.`;
}

function safetyWords(
  safety_ms: number,
  tripDelay_ms: number,
  trip: number | null,
  samples: number,
): string {
  if (safety_ms === 0 || trip === null) return "No process safety time is claimed for it.";
  const left_ms = safety_ms - tripDelay_ms - REACTION_ms;
  const rate =
    left_ms > 0
      ? `the slowest rate that meets it is ${formatQuantity("rate", (1000 * samples) / left_ms, 0.1)}`
      : "no rate meets it with this delay";
  return `Process safety time, from hazard to dark: ${time(safety_ms)}; ${rate}.`;
}

const time = (value_ms: number): string => formatQuantity("time", value_ms);
