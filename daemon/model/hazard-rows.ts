import type { HazardId, HazardLevels } from "./bench.ts";
import type { QuantityKind } from "./quantity-units.ts";

/**
 * What the levels of each hazard row stand for, and their defaults where a bench file says nothing.
 * Defaults are common practice for a fan-cooled pump diode of a watt or two, without a published
 * source; a data sheet always wins. The words and causes of the rows are in judge/.
 */
export interface HazardRow {
  /** What is compared with the level, to follow "the level of this row is". */
  readonly measures: string;
  /** Kind of the level; "fact" is a yes or no: present or not, without a number. */
  readonly level: QuantityKind | "fact";
  /** On which side of the level the danger lies. */
  readonly danger: "above" | "below";
  /** Channels without which the row is blind. */
  readonly needs: readonly string[];
  /** Samples that must agree before the host can say so (a median of five turns on the third). */
  readonly samples: number;
  /** Levels that follow from elsewhere in the bench file and cannot be written in `hazards`. */
  readonly follows: string | null;
  readonly defaults: HazardLevels;
}

/** A bench's own times, from which the defaults of some rows follow. */
export interface HazardTimes {
  readonly rate_perS: number;
  readonly term_ms: number;
  readonly darkTime_ms: number;
}

type Pair = readonly [level: number | null, delay_ms: number];

const NONE: Pair = [null, 0];
const row = (
  level: HazardRow["level"],
  measures: string,
  danger: HazardRow["danger"],
  needs: readonly string[],
  warn: Pair,
  trip: Pair,
  rest: { deadband?: number; safety_ms: number; samples?: number; follows?: string },
): HazardRow => ({
  measures,
  level,
  danger,
  needs,
  samples: rest.samples ?? 1,
  follows: rest.follows ?? null,
  defaults: {
    warn: warn[0],
    warnDelay_ms: warn[1],
    trip: trip[0],
    tripDelay_ms: trip[1],
    deadband: rest.deadband ?? 0,
    safety_ms: rest.safety_ms,
  },
});
const above = "above";
const below = "below";

export const HAZARD_ROWS: Readonly<Record<HazardId, HazardRow>> = {
  // At trip the judge allows max(level − 1, 2 counts) above the ceiling.
  "over-ceiling": row(
    "ratio",
    "measured current as a share of the highest ceiling of the last fall time",
    above,
    ["current"],
    [0.98, 10_000],
    [1.01, 30],
    { deadband: 0.005, safety_ms: 250, samples: 2 },
  ),
  "follow-high": row(
    "ratio",
    "measured current above its aim, as a share of the aim",
    above,
    ["current", "set"],
    [0.02, 1000],
    [0.05, 50],
    { deadband: 0.005, safety_ms: 500, samples: 2 },
  ),
  "follow-low": row(
    "ratio",
    "measured current below its aim, as a share of the aim",
    above,
    ["current", "set"],
    [0.02, 1000],
    [0.1, 300],
    { deadband: 0.005, safety_ms: 1000, samples: 2 },
  ),
  "case-over": row(
    "temperature",
    "case temperature, median of five samples",
    above,
    ["case"],
    [42, 5000],
    [50, 300],
    { deadband: 2, safety_ms: 1000, samples: 3 },
  ),
  // Share of the divider that the sensor takes: near 1 it is open, near 0 it is shorted.
  "case-open": row(
    "ratio",
    "the case sensor's share of its divider",
    above,
    ["case"],
    NONE,
    [0.985, 100],
    {
      safety_ms: 500,
    },
  ),
  "case-short": row(
    "ratio",
    "the case sensor's share of its divider",
    below,
    ["case"],
    NONE,
    [0.02, 100],
    {
      safety_ms: 500,
    },
  ),
  "sensor-range": row(
    "count",
    "counts by which a judged channel lies outside its range in the manifest",
    above,
    ["set", "current", "case", "photodiode"],
    NONE,
    [1, 100],
    { safety_ms: 500 },
  ),
  "sample-gap": row("time", "time since the last sample", above, [], [0, 0], [0, 0], {
    safety_ms: 0,
    follows:
      "controller.rate (a warning after three periods, or a quarter of the term) and controller.term (the trip)",
  }),
  "tick-drift": row(
    "ratio",
    "difference of rate between the board's clock and this computer's",
    above,
    [],
    [0.005, 60_000],
    [0.03, 10_000],
    { deadband: 0.001, safety_ms: 15_000 },
  ),
  "controller-reset": row("fact", "the board started anew", above, [], NONE, [1, 0], {
    safety_ms: 500,
  }),
  key: row("fact", "the key reads off", above, [], NONE, [1, 0], { safety_ms: 250 }),
  loop: row("fact", "the interlock loop reads open", above, [], NONE, [1, 0], { safety_ms: 250 }),
  "dark-current": row(
    "current",
    "measured current while the bench is dark",
    above,
    ["current"],
    [5, 1000],
    [20, 100],
    { deadband: 1, safety_ms: 500, samples: 2 },
  ),
  "dark-light": row(
    "ratio",
    "photodiode as a share of its scale while the bench is dark",
    above,
    ["photodiode"],
    [0.01, 10_000],
    [0.05, 500],
    { deadband: 0.002, safety_ms: 1000, samples: 2 },
  ),
  "output-low": row(
    "ratio",
    "output as a share of what the bench file's diode and crystal would give",
    below,
    ["photodiode", "current", "case"],
    [0.9, 30_000],
    [0.5, 1000],
    { deadband: 0.02, safety_ms: 2000, samples: 2 },
  ),
  "margin-low": row(
    "ratio",
    "distance of the current from the floor, as a share of the current",
    below,
    ["current", "case"],
    [0.3, 60_000],
    NONE,
    { deadband: 0.02, safety_ms: 0 },
  ),
  // The trip is the controller's own: an old permit is dead there whatever the host thinks.
  "permit-age": row(
    "ratio",
    "age of the last permit on arrival, as a share of its term",
    above,
    [],
    [0.5, 0],
    [1, 0],
    { safety_ms: 0 },
  ),
  "curve-differs": row(
    "fact",
    "the board's curve is not the one this bench file makes",
    above,
    [],
    NONE,
    [1, 0],
    {
      safety_ms: 500,
    },
  ),
  "dark-time": row("time", "time armed at zero current", above, [], NONE, [0, 0], {
    safety_ms: 0,
    follows: "limits.dark-time",
  }),
  "link-lost": row("fact", "the port closed or fell silent", above, [], NONE, [1, 0], {
    safety_ms: 0,
  }),
};

/** The levels of a row where the bench file writes none. A safety time of 0 means: none is claimed. */
export function defaultLevels(id: HazardId, times: HazardTimes): HazardLevels {
  const { defaults } = HAZARD_ROWS[id];
  if (id === "sample-gap") {
    // Three periods, but a stall that a desktop computer has every few minutes is not worth a word:
    // it is told from a quarter of the term on.
    const warn = Math.max(3000 / times.rate_perS, times.term_ms / 4);
    return { ...defaults, warn, trip: times.term_ms };
  }
  if (id === "dark-time") return { ...defaults, trip: times.darkTime_ms };
  return defaults;
}
