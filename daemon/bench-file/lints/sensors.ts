import type { Bench } from "../../model/bench.ts";
import type { Conversion, Divider, Law } from "../../model/conversion.ts";
import { formatQuantity } from "../../model/quantities.ts";
import {
  direction,
  lawToCount,
  lawToUnit,
  selfHeating_K,
  sensorShare,
} from "../../physics/convert.ts";
import type { Finding } from "../problem.ts";
import { error, warning } from "./finding.ts";

/** Above the trip level the sensor must still read this much further, so that noise does not clip. */
const SPAN_ABOVE_K = 3;
/** A count that stands for more than this hides what happens near the trip. */
const COUNT_K_MAX = 0.5;
/** Thermistors are made with these betas; others are mostly a slip. Common practice. */
const BETA_K_MIN = 2500;
const BETA_K_MAX = 5500;

type Resistive = Exclude<Law, { kind: "linear" }>;
const degC = (value: number): string => formatQuantity("temperature", value);

export function lintSensors(bench: Bench): Finding[] {
  const findings: Finding[] = [];
  for (const [name, conversion] of Object.entries(bench.conversions)) {
    const { law } = conversion;
    if (law.kind === "linear") continue;
    const path = ["channels", name, law.kind] as const;
    const nonsense = lintConstants(law, path);
    findings.push(...nonsense);
    if (nonsense.length === 0) findings.push(...lintHeating(conversion, name));
    if (name === "case" && nonsense.length === 0) {
      findings.push(...lintSpan(bench, law, path), ...lintColdSpan(bench, law, path));
    }
  }
  return [...findings, ...lintUnseen(bench)];
}

function lintConstants(law: Resistive, path: readonly string[]): Finding[] {
  if (law.kind === "ntc" && (law.beta_K < BETA_K_MIN || law.beta_K > BETA_K_MAX)) {
    return [
      warning("thermistor", [...path, "beta"], {
        found: formatQuantity("difference", law.beta_K, 1),
        wanted: `a beta from ${BETA_K_MIN} to ${BETA_K_MAX} K, as thermistors have`,
        do: "take beta from the thermistor's data sheet",
      }),
    ];
  }
  if (law.kind !== "steinhart-hart") return [];
  const { divider } = law;
  const at25 = shareAt(law, 25);
  const falls = shareAt(law, 0) > at25 && at25 > shareAt(law, 60);
  const middle = lawToUnit(law, divider.full_counts / 2);
  if (law.b > 0 && law.c >= 0 && falls && middle > -60 && middle < 200) return [];
  return [
    error("thermistor", path, {
      found: `coefficients that read ${degC(middle)} where sensor and resistor are equal`,
      wanted: "A near 0.001, B near 0.0002 and C near 1e-7, with R in ohm, as thermistors have",
      do: "check the coefficients' powers of ten, and that they are for ohm and not for kilo-ohm",
    }),
  ];
}

const shareAt = (law: Resistive, value: number): number =>
  sensorShare(law.divider, lawToCount(law, value));

/** Whether the sensor can tell the trip level from an open or shorted sensor. */
function lintSpan(bench: Bench, law: Resistive, path: readonly string[]): Finding[] {
  const { trip } = bench.hazards["case-over"];
  if (trip === null) return [];
  const top = trip + SPAN_ABOVE_K;
  const share = shareAt(law, top);
  const open = bench.hazards["case-open"].trip ?? 1;
  const short = bench.hazards["case-short"].trip ?? 0;
  if (!(share > short && share < open)) {
    return [
      error("sensor-span", [...path, "fixed"], {
        found: `${formatQuantity("ratio", share, 0.001)} of the divider on the sensor at ${degC(top)}`,
        wanted: `a share between ${formatQuantity("ratio", short, 0.001)} (read as shorted) and ${formatQuantity("ratio", open, 0.001)} (read as open)`,
        do: `choose a fixed resistor nearer to the sensor's resistance at ${degC(trip)}`,
      }),
    ];
  }
  const perCount_K = countStep_K(law, law.divider, trip);
  if (perCount_K <= COUNT_K_MAX) return [];
  return [
    warning("sensor-coarse", [...path, "fixed"], {
      found: `${formatQuantity("difference", perCount_K, 0.1)} a count at ${degC(trip)}`,
      wanted: `at most ${formatQuantity("difference", COUNT_K_MAX, 0.1)} a count near the trip level`,
      do: "choose a fixed resistor nearer to the sensor's, or let the board add more readings",
    }),
  ];
}

/** Whether the sensor can tell the coolest case from an open or shorted sensor. */
function lintColdSpan(bench: Bench, law: Resistive, path: readonly string[]): Finding[] {
  const cold = bench.derating[0]?.case_degC;
  if (cold === undefined) return [];
  const share = shareAt(law, cold);
  const open = bench.hazards["case-open"].trip ?? 1;
  const short = bench.hazards["case-short"].trip ?? 0;
  if (share > short && share < open) return [];
  return [
    warning("sensor-span-cold", [...path, "fixed"], {
      found: `${formatQuantity("ratio", share, 0.001)} of the divider on the sensor at ${degC(cold)}`,
      wanted: `a share between ${formatQuantity("ratio", short, 0.001)} (read as shorted) and ${formatQuantity("ratio", open, 0.001)} (read as open)`,
      do: `choose a fixed resistor nearer to the sensor's resistance at ${degC(cold)}`,
    }),
  ];
}

/** How much one count stands for at a value, in the channel's unit. */
export function countStep_K(law: Law, divider: Divider, at_degC: number): number {
  const count = lawToCount(law, at_degC);
  const one = direction(law);
  const next = Math.min(divider.full_counts, Math.max(0, count + one));
  return Math.abs(lawToUnit(law, next) - at_degC);
}

/** How much a sensor is warmed by its own divider where it is warmed most; 0 where not known. */
export function worstHeating_K(law: Law): number {
  if (law.kind === "linear" || law.divider.heating === undefined) return 0;
  const { supply_mV, dissipation_mWperK } = law.divider.heating;
  // A divider gives its sensor the most where both resistors are equal.
  const fixed = law.divider.fixed_ohm;
  return selfHeating_K(supply_mV, fixed, fixed, dissipation_mWperK);
}

function lintHeating({ law, error: stated_K }: Conversion, name: string): Finding[] {
  const heating_K = worstHeating_K(law);
  if (heating_K <= stated_K) return [];
  return [
    warning("self-heating", ["channels", name, "error"], {
      found: `a sensor that its own divider warms by up to ${formatQuantity("difference", heating_K, 0.01)}`,
      wanted: `at most the stated error of ${formatQuantity("difference", stated_K, 0.01)}`,
      do: "power the divider only while it is read, use larger resistors, or state a larger error",
    }),
  ];
}

/** Rows that see nothing unless the board itself tells the unit. */
function lintUnseen({ conversions, hazards }: Bench): Finding[] {
  const findings: Finding[] = [];
  if (conversions.case === undefined) {
    findings.push(
      warning("unseen", ["channels"], {
        found: "no channels.case",
        wanted: "how the case sensor's counts become °C, unless the board tells °C itself",
        do: "add channels.case with the law of your sensor",
      }),
    );
  }
  const { warn, trip } = hazards["output-low"];
  if (conversions.photodiode === undefined && (warn !== null || trip !== null)) {
    findings.push(
      warning("unseen", ["channels"], {
        found: "no channels.photodiode, so the row output-low has no power to compare",
        wanted: "what a count of the photodiode stands for, unless the board tells mW itself",
        do: "add channels.photodiode, or write none for warn and trip of hazards.output-low",
      }),
    );
  }
  return findings;
}
