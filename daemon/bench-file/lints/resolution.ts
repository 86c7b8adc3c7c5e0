import type { Bench } from "../../model/bench.ts";
import { formatQuantity } from "../../model/quantities.ts";
import type { QuantityKind } from "../../model/quantity-units.ts";
import { power_mW } from "../../physics/diode.ts";
import type { Finding } from "../problem.ts";
import { warning } from "./finding.ts";
import { countStep_K } from "./sensors.ts";

/** Two counts of a converter may be this share of what its row is to notice. */
const STEPS = 2;
/** The judge allows 1 % above the ceiling; coarser steps widen that. */
const CURRENT_SHARE = 0.01;

const kelvin = (value: number): string => formatQuantity("difference", value, 0.01);

/** What sensors and converters cannot tell apart, against what the rows are to notice. */
export function lintResolution(bench: Bench): Finding[] {
  return [
    ...lintSteps(bench, "set", bench.limits.current_mA * CURRENT_SHARE, "current"),
    ...lintSteps(bench, "current", bench.limits.current_mA * CURRENT_SHARE, "current"),
    ...lintSteps(bench, "photodiode", noticed_mW(bench), "power"),
    ...lintCaseError(bench),
    ...lintDeadband(bench),
    ...lintOutputError(bench),
  ];
}

function lintSteps(
  { conversions }: Bench,
  name: string,
  noticed: number,
  kind: QuantityKind,
): Finding[] {
  const law = conversions[name]?.law;
  if (law?.kind !== "linear" || !(STEPS * Math.abs(law.perCount) > noticed)) return [];
  const fine = noticed / STEPS;
  return [
    warning("steps-coarse", ["channels", name, "linear", "per-count"], {
      found: `${formatQuantity(kind, Math.abs(law.perCount), 0.01)} a count`,
      wanted: `at most ${formatQuantity(kind, fine, fine / 100)}, so that two counts are no more than what is to be noticed`,
      do: "use a converter with more bits or a smaller range, or let the board add readings",
    }),
  ];
}

/** Least loss of light that output-low is to notice at the bench's limit; NaN where the row is off. */
function noticed_mW({ diode, crystal, limits, hazards }: Bench): number {
  const level = hazards["output-low"].warn ?? hazards["output-low"].trip;
  // A crystal's output depends on too much to say what one count of it is worth.
  if (level === null || crystal !== null) return Number.NaN;
  return (1 - level) * power_mW(diode, limits.current_mA, diode.ref_degC);
}

function lintOutputError(bench: Bench): Finding[] {
  const error_mW = bench.conversions.photodiode?.error ?? 0;
  const noticed = noticed_mW(bench);
  if (!(error_mW > noticed)) return [];
  return [
    warning("output-error", ["channels", "photodiode", "error"], {
      found: formatQuantity("power", error_mW),
      wanted: `at most ${formatQuantity("power", noticed)}, the loss that hazards.output-low is to notice`,
      do: "calibrate the photodiode, or write a lower level for the row",
    }),
  ];
}

function lintCaseError({ conversions, hazards, limits }: Bench): Finding[] {
  const error_K = conversions.case?.error ?? 0;
  const { warn, trip } = hazards["case-over"];
  const findings: Finding[] = [];
  if (warn !== null && trip !== null && error_K > trip - warn) {
    findings.push(
      warning("error-large", ["channels", "case", "error"], {
        found: kelvin(error_K),
        wanted: `at most ${kelvin(trip - warn)}, the distance from warning to trip of hazards.case-over`,
        do: "calibrate the sensor, or move warning and trip apart",
      }),
    );
  }
  if (limits.recover_K < error_K) {
    findings.push(
      warning("recover-small", ["limits", "recover"], {
        found: `${kelvin(limits.recover_K)} against a case reading that may be ${kelvin(error_K)} off`,
        wanted: `${kelvin(error_K)} or more, or noise lifts a cap`,
        do: `write ${kelvin(error_K)} or more`,
      }),
    );
  }
  return findings;
}

function lintDeadband({ conversions, hazards }: Bench): Finding[] {
  const law = conversions.case?.law;
  const { warn, deadband } = hazards["case-over"];
  if (law === undefined || warn === null) return [];
  const step_K =
    law.kind === "linear" ? Math.abs(law.perCount) : countStep_K(law, law.divider, warn);
  if (!(deadband < step_K)) return [];
  return [
    warning("deadband-small", ["hazards", "case-over", "deadband"], {
      found: `${kelvin(deadband)}, less than one count with ${kelvin(step_K)}`,
      wanted: "a deadband of some counts, or the warning comes and goes with each",
      do: `write ${kelvin(3 * step_K)} or more`,
    }),
  ];
}
