import { type Bench, HAZARD_IDS, type HazardId } from "../../model/bench.ts";
import { HAZARD_ROWS } from "../../model/hazard-rows.ts";
import { formatQuantity } from "../../model/quantities.ts";
import type { Finding } from "../problem.ts";
import { error, warning } from "./finding.ts";

/**
 * Time from a sample's arrival to dark that is not the row's own: line and judge at their worst
 * allowed (50 ms), and the fall of a stage with a 10 ms filter from 1.8 A to 5 mA (59 ms).
 */
export const REACTION_ms = 110;

/** Writes a level of a row in the row's own unit. */
export function levelWords(id: HazardId, value: number): string {
  const { level } = HAZARD_ROWS[id];
  if (level === "fact") return "yes";
  return formatQuantity(level, value, level === "ratio" ? 0.001 : undefined);
}

export function lintHazards(bench: Bench): Finding[] {
  return [
    ...HAZARD_IDS.flatMap((id) => [
      ...lintLevels(bench, id),
      ...lintSafetyTime(bench, id),
      ...lintOff(bench, id),
    ]),
    ...lintCaseTrip(bench),
  ];
}

function lintLevels(bench: Bench, id: HazardId): Finding[] {
  const { warn, trip } = bench.hazards[id];
  const row = HAZARD_ROWS[id];
  if (warn === null || trip === null || row.level === "fact" || row.follows !== null) return [];
  if (row.danger === "above" ? warn < trip : warn > trip) return [];
  const side = row.danger === "above" ? "below" : "above";
  return [
    error("warn-beyond-trip", ["hazards", id, "warn"], {
      found: `a warning at ${levelWords(id, warn)} and a trip at ${levelWords(id, trip)}`,
      wanted: `a warning ${side} the trip, or nobody is warned`,
      do: `write a warning ${side} ${levelWords(id, trip)}`,
    }),
  ];
}

/** The slowest rate at which the host still meets a row's process safety time. */
export interface RowRate {
  readonly id: HazardId;
  /** Samples per second; Infinity where no rate can. */
  readonly slowest_perS: number;
}

/** Every row that trips on samples and claims a safety time, with the slowest rate that meets it. */
export function slowestRates(bench: Bench): RowRate[] {
  const rates: RowRate[] = [];
  for (const id of HAZARD_IDS) {
    const { trip, tripDelay_ms, safety_ms } = bench.hazards[id];
    if (trip === null || safety_ms === 0) continue;
    const left_ms = safety_ms - tripDelay_ms - REACTION_ms;
    const slowest = left_ms > 0 ? (1000 * HAZARD_ROWS[id].samples) / left_ms : Infinity;
    rates.push({ id, slowest_perS: slowest });
  }
  return rates;
}

function lintSafetyTime(bench: Bench, id: HazardId): Finding[] {
  const needed = slowestRates(bench).find((rate) => rate.id === id);
  const { rate_perS } = bench.controller;
  if (needed === undefined || rate_perS >= needed.slowest_perS) return [];
  const { safety_ms, tripDelay_ms } = bench.hazards[id];
  const safety = formatQuantity("time", safety_ms);
  if (needed.slowest_perS === Infinity) {
    return [
      error("too-late", ["hazards", id, "trip-after"], {
        found: `a trip after ${formatQuantity("time", tripDelay_ms)} in a row whose safety time is ${safety}`,
        wanted: `at least ${REACTION_ms} ms left for line, judge and fall of the current`,
        do: "write a shorter trip-after, or the safety time that this hazard really allows",
      }),
    ];
  }
  const slowest = formatQuantity("rate", Math.ceil(needed.slowest_perS * 10) / 10, 0.1);
  return [
    error("rate-slow", ["controller", "rate"], {
      found: `${formatQuantity("rate", rate_perS)}, too slow for the row ${id}`,
      wanted: `${slowest} or more, to be dark within its safety time of ${safety}`,
      do: `write a rate of ${slowest} or more, or a shorter trip-after of hazards.${id}`,
    }),
  ];
}

/** A row that trips or warns by default and does not in this file. */
function lintOff(bench: Bench, id: HazardId): Finding[] {
  const { defaults, measures } = HAZARD_ROWS[id];
  const { warn, trip } = bench.hazards[id];
  if (defaults.warn !== null && warn === null && trip !== null) {
    return [
      warning("warn-off", ["hazards", id, "warn"], {
        found: "a trip without a warning",
        wanted: `a warning before ${measures} goes too far`,
        do: "take the line out to have the default back, unless you mean it",
      }),
    ];
  }
  if (defaults.trip === null || trip !== null) return [];
  return [
    warning("row-off", ["hazards", id, "trip"], {
      found: "no trip",
      wanted: `a trip when ${measures} goes too far`,
      do: "take the line out to have the default back, unless you mean it",
    }),
  ];
}

/** A case as warm as the junction may be leaves no room for any current at all. */
function lintCaseTrip({ hazards, diode }: Bench): Finding[] {
  const { trip } = hazards["case-over"];
  if (trip === null || diode.junction_degC_max === null || trip < diode.junction_degC_max)
    return [];
  return [
    error("case-trip-high", ["hazards", "case-over", "trip"], {
      found: `${formatQuantity("temperature", trip)}, not below the junction's limit of ${formatQuantity("temperature", diode.junction_degC_max)}`,
      wanted: "a case that trips well before its junction is too warm",
      do: "write a lower trip, or check diode.junction-max",
    }),
  ];
}
