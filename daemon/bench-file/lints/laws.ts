import type { Bench } from "../../model/bench.ts";
import { formatQuantity } from "../../model/quantities.ts";
import { absorbedShareAt } from "../../physics/crystal.ts";
import { forward_mV, power_mW } from "../../physics/diode.ts";
import { photon_eV, quantumDefect } from "../../physics/photon.ts";
import type { Finding } from "../problem.ts";
import { error, warning } from "./finding.ts";

/** Share of electrical power that diodes turn into light; outside, suspect a number. Common practice. */
const EFFICIENCY_MIN = 0.1;
const EFFICIENCY_MAX = 0.75;

/** Exponential laws are not trusted further than this from where their numbers were taken, K. */
const REFERENCE_K_MAX = 40;
/** Share of the pump that a well placed crystal absorbs at some temperature at least. */
const ABSORBED_MIN = 0.5;
/** A forward voltage may be this much under one photon's energy: both numbers are rounded. */
const PHOTON_SHARE_MIN = 0.95;

const percent = (value: number): string => formatQuantity("ratio", value);

/** Numbers that physics does not allow, or hardly. */
export function lintLaws(bench: Bench): Finding[] {
  return [
    ...lintQuantum(bench),
    ...lintEfficiency(bench),
    ...lintVoltage(bench),
    ...lintTemperatures(bench),
    ...lintCrystal(bench),
  ];
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
  // Below threshold there is no light to judge by; that is another lint's.
  if (share === 0) return [];
  const at = `${formatQuantity("current", limits.current_mA)} and ${formatQuantity("voltage", forward_mV(diode, limits.current_mA))}`;
  if (share > 1) {
    return [
      error("efficiency-impossible", ["diode", "slope"], {
        found: `${percent(share)} of the electrical power as light, at ${at}`,
        wanted: "less light than electrical power: 30 to 40 % is usual",
        do: "check diode.slope, diode.voltage and diode.resistance for a wrong unit",
      }),
    ];
  }
  return [
    warning("efficiency", ["diode", "slope"], {
      found: `${percent(share)} of the electrical power as light, at ${at}`,
      wanted: `${percent(EFFICIENCY_MIN)} to ${percent(EFFICIENCY_MAX)}, 30 to 40 % is usual (common practice, no source)`,
      do: "check diode.slope, diode.voltage and diode.resistance for a wrong unit",
    }),
  ];
}

function lintVoltage({ diode, limits }: Bench): Finding[] {
  const forward = forward_mV(diode, limits.current_mA);
  const photon_mV = 1000 * photon_eV(diode.wavelength_nm);
  if (Number.isNaN(forward) || forward >= PHOTON_SHARE_MIN * photon_mV) return [];
  return [
    warning("voltage-under-photon", ["diode", "voltage"], {
      found: `${formatQuantity("voltage", forward)} at ${formatQuantity("current", limits.current_mA)}`,
      wanted: `at least ${formatQuantity("voltage", photon_mV)}, the energy of one photon of ${formatQuantity("length", diode.wavelength_nm)} for each electron`,
      do: "check diode.voltage, diode.resistance and diode.wavelength",
    }),
  ];
}

function lintTemperatures({ diode, derating }: Bench): Finding[] {
  const findings: Finding[] = [];
  if (diode.t1_K < diode.t0_K) {
    findings.push(
      warning("t1-under-t0", ["diode", "slope-t1"], {
        found: `${formatQuantity("difference", diode.t1_K, 1)}, less than threshold-t0 with ${formatQuantity("difference", diode.t0_K, 1)}`,
        wanted: "a slope that holds out against warmth longer than threshold, as most diodes have",
        do: "check that the two were not swapped",
      }),
    );
  }
  const first = derating[0]?.case_degC ?? diode.ref_degC;
  const last = derating[derating.length - 1]?.case_degC ?? diode.ref_degC;
  const far_K = Math.max(first - diode.ref_degC, diode.ref_degC - last);
  if (far_K > REFERENCE_K_MAX) {
    findings.push(
      warning("reference-far", ["diode", "at"], {
        found: `${formatQuantity("temperature", diode.ref_degC)}, ${formatQuantity("difference", far_K, 1)} outside the derating`,
        wanted: `at most ${formatQuantity("difference", REFERENCE_K_MAX, 1)} outside it`,
        do: "take threshold and slope at a temperature that the bench reaches, and write it as diode.at",
      }),
    );
  }
  return findings;
}

function lintCrystal({ diode, crystal, derating, limits }: Bench): Finding[] {
  if (crystal === null) return [];
  if (crystal.wavelength_nm <= diode.wavelength_nm) {
    return [
      error("crystal-upconverts", ["crystal", "wavelength"], {
        found: `${formatQuantity("length", crystal.wavelength_nm)} from a pump of ${formatQuantity("length", diode.wavelength_nm)}`,
        wanted: "light of a longer wavelength than its pump",
        do: "check crystal.wavelength and diode.wavelength",
      }),
    ];
  }
  const shares = derating.map(({ case_degC, current_mA }) =>
    absorbedShareAt(diode, crystal, Math.min(current_mA, limits.current_mA), case_degC),
  );
  const best = Math.max(...shares);
  if (!(best < ABSORBED_MIN)) return [];
  return [
    warning("pump-off-line", ["crystal", "line"], {
      found: `at most ${percent(best)} of the pump absorbed at any point of the derating`,
      wanted: `${percent(ABSORBED_MIN)} or more somewhere`,
      do: "check diode.wavelength, crystal.line, crystal.line-width and crystal.pump-drift",
    }),
  ];
}
