import { z } from "zod";
import { HAZARD_IDS, type HazardId, type HazardLevels } from "../model/bench.ts";
import { defaultLevels, HAZARD_ROWS, type HazardTimes } from "../model/hazard-rows.ts";
import type { QuantityKind } from "../model/quantity-units.ts";
import { wordShape } from "./field-shapes.ts";
import { quantity, quantityOrNone, section } from "./fields.ts";

/**
 * The `hazards` section: every row may be named, and of a row only what differs from the default.
 * A key that the file leaves out reads as undefined and is filled in by `hazardLevels`.
 */
const DELAY = { min: 0, max: 3_600_000 };

function rowSchema(id: HazardId) {
  const row = HAZARD_ROWS[id];
  const level = row.level === "fact" ? factOrNone() : levelOf(row.level);
  const deadband = row.level === "temperature" ? "difference" : row.level;
  return section(`the levels of ${id}`, {
    warn: level.describe("Level at which the row warns."),
    "warn-after": quantity("time", DELAY, Number.NaN).describe("How long it must stand first."),
    trip: level.describe("Level at which the row ends light."),
    "trip-after": quantity("time", DELAY, Number.NaN).describe("How long it must stand first."),
    ...(deadband === "fact"
      ? {}
      : {
          deadband: quantity(deadband, { min: 0, max: 1e6 }, Number.NaN).describe(
            "How far it must come back before a warning ends.",
          ),
        }),
    "safety-time": quantity("time", { min: 1, max: 3_600_000 }, Number.NaN).describe(
      "Longest time from the hazard to dark.",
    ),
  })
    .describe(`Watches: ${row.measures}.`)
    .optional();
}

/** NaN stands for "not written": null is taken by the word `none`. */
const levelOf = (kind: QuantityKind) =>
  quantityOrNone(kind, { min: kind === "temperature" ? -60 : 0, max: 1e6 }, Number.NaN);

function factOrNone() {
  return z
    .unknown()
    .optional()
    .transform((found, context): number | null => {
      if (found === undefined) return Number.NaN;
      if (found === "yes") return 1;
      if (found === "none" || found === "no") return null;
      const advice = "write yes or none";
      const params = {
        code: "word",
        found: typeof found === "string" ? found.slice(0, 60) : "a list or a map",
        wanted: "yes or none: this row is a plain fact without a level",
        do: advice,
      };
      context.addIssue({ code: "custom", params, message: advice });
      return z.NEVER;
    })
    .meta(wordShape("a plain fact, without a level", ["yes", "no", "none"], undefined));
}

const WRITABLE = HAZARD_IDS.filter((id) => HAZARD_ROWS[id].follows === null);

export const hazardsSchema = section(
  "a map of hazard rows",
  Object.fromEntries(WRITABLE.map((id) => [id, rowSchema(id)])),
);

type WrittenRow = z.output<ReturnType<typeof rowSchema>>;

/** Levels of every row: what the file writes, and for the rest the default. */
export function hazardLevels(
  written: Readonly<Record<string, WrittenRow>>,
  times: HazardTimes,
): Record<HazardId, HazardLevels> {
  const levels: Partial<Record<HazardId, HazardLevels>> = {};
  for (const id of HAZARD_IDS) levels[id] = fillIn(written[id], defaultLevels(id, times));
  return levels as Record<HazardId, HazardLevels>;
}

function fillIn(row: WrittenRow, defaults: HazardLevels): HazardLevels {
  if (row === undefined) return defaults;
  const or = <T extends number | null>(value: T | undefined, fallback: T): T =>
    value === undefined || Number.isNaN(value) ? fallback : value;
  return {
    warn: or<number | null>(row.warn, defaults.warn),
    warnDelay_ms: or(row["warn-after"], defaults.warnDelay_ms),
    trip: or<number | null>(row.trip, defaults.trip),
    tripDelay_ms: or(row["trip-after"], defaults.tripDelay_ms),
    deadband: or("deadband" in row ? (row.deadband as number) : Number.NaN, defaults.deadband),
    safety_ms: or(row["safety-time"], defaults.safety_ms),
  };
}
