import type { Bench } from "../../model/bench.ts";
import { formatQuantity } from "../../model/quantities.ts";
import { forward_mV, power_mW } from "../../physics/diode.ts";
import { photon_eV, quantumDefect } from "../../physics/photon.ts";
import type { Finding } from "../problem.ts";
import { warning } from "./finding.ts";

/** Share of electrical power that diodes turn into light; outside, suspect a number. Common practice. */
const EFFICIENCY_MIN = 0.1;
const EFFICIENCY_MAX = 0.75;

const percent = (value: number): string => formatQuantity("ratio", value);

/** Numbers that physics does not allow, or hardly. */
export function lintLaws(bench: Bench): Finding[] {
  return [...lintQuantum(bench), ...lintEfficiency(bench)];
}

function lintQuantum({ diode, crystal }: Bench): Finding[] {
  const findings: Finding[] = [];
  const most = photon_eV(diode.wavelength_nm);
  if (diode.slope_mWpermA > most) {
    findings.push(
      warning("beyond-quantum", ["diode", "slope"], {
        found: formatQuantity("slope", diode.slope_mWpermA),
        wanted: `at most ${formatQuantity("slope", most)}: one photon for each electron at this wavelength`,
        do: "check the slope's unit and the power meter's calibration",
      }),
    );
  }
  if (crystal === null) return findings;
  const limit = 1 - quantumDefect(diode.wavelength_nm, crystal.wavelength_nm);
  if (crystal.slope > limit) {
    findings.push(
      warning("beyond-quantum", ["crystal", "slope"], {
        found: percent(crystal.slope),
        wanted: `at most ${percent(limit)} of the absorbed pump light: one photon for each photon`,
        do: "check the slope, which counts absorbed pump light, and the two wavelengths",
      }),
    );
  }
  return findings;
}

function lintEfficiency({ diode, limits }: Bench): Finding[] {
  const electrical = (forward_mV(diode, limits.current_mA) * limits.current_mA) / 1000;
  const share = power_mW(diode, limits.current_mA, diode.ref_degC) / electrical;
  if (Number.isNaN(share) || (share >= EFFICIENCY_MIN && share <= EFFICIENCY_MAX)) return [];
  const at = `${formatQuantity("current", limits.current_mA)} and ${formatQuantity("voltage", forward_mV(diode, limits.current_mA))}`;
  return [
    warning("efficiency", ["diode", "slope"], {
      found: `${percent(share)} of the electrical power as light, at ${at}`,
      wanted: `${percent(EFFICIENCY_MIN)} to ${percent(EFFICIENCY_MAX)}, as laser diodes give`,
      do: "check diode.slope, diode.voltage and diode.resistance for a wrong unit",
    }),
  ];
}
