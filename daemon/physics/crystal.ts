import type { CrystalPart, DiodePart } from "../model/bench.ts";
import { forward_mV, heat_mW, junction_degC, power_mW, threshold_mA } from "./diode.ts";

/**
 * A crystal pumped by the diode: the pump's wavelength follows its junction and drifts across the
 * crystal's absorption line, so current and temperature act through more than the diode's own laws.
 */

/** Wavelength of the pump, nm, with its junction at that temperature. */
export function pump_nm(diode: DiodePart, crystal: CrystalPart, junction_degC: number): number {
  return diode.wavelength_nm + crystal.pumpDrift_nmPerK * (junction_degC - diode.ref_degC);
}

/** Share of pump light absorbed: 1 − exp(−depth · Lorentzian), 0 to 1. */
export function absorbedShare(crystal: CrystalPart, wavelength_nm: number): number {
  const off = (wavelength_nm - crystal.line_nm) / (crystal.lineWidth_nm / 2);
  return 1 - Math.exp(-crystal.depth / (1 + off * off));
}

/**
 * The same at a current and a case temperature, the junction warmed by the diode's own heat; where
 * voltage or thermal resistance is not known the junction is taken to be as warm as the case.
 */
export function absorbedShareAt(
  diode: DiodePart,
  crystal: CrystalPart,
  current_mA: number,
  case_degC: number,
): number {
  const known = diode.rjc_KperW !== null && !Number.isNaN(forward_mV(diode, current_mA));
  const junction = known
    ? junction_degC(diode, case_degC, heat_mW(diode, current_mA, case_degC))
    : case_degC;
  return absorbedShare(crystal, pump_nm(diode, crystal, junction));
}

/** Pump light that the crystal absorbs, mW. */
export function absorbed_mW(
  diode: DiodePart,
  crystal: CrystalPart,
  current_mA: number,
  case_degC: number,
): number {
  const pump_mW = power_mW(diode, current_mA, case_degC);
  if (pump_mW === 0) return 0;
  return pump_mW * absorbedShareAt(diode, crystal, current_mA, case_degC);
}

/** Light of the crystal, mW; zero below its threshold. */
export function crystalOutput_mW(
  diode: DiodePart,
  crystal: CrystalPart,
  current_mA: number,
  case_degC: number,
): number {
  const above_mW = absorbed_mW(diode, crystal, current_mA, case_degC) - crystal.threshold_mW;
  return above_mW > 0 ? crystal.slope * above_mW : 0;
}

/**
 * Pump light that passes the crystal and reaches the detector, mW.
 * @param leak share of the unabsorbed pump light that gets there, 0 to 1
 */
export function residualPump_mW(
  diode: DiodePart,
  crystal: CrystalPart,
  current_mA: number,
  case_degC: number,
  leak: number,
): number {
  const passed = 1 - absorbedShareAt(diode, crystal, current_mA, case_degC);
  return leak * passed * power_mW(diode, current_mA, case_degC);
}

/** Steps of the search for the floor; the absorbed light has one hump, far wider than a step. */
const FLOOR_STEPS = 48;
const FLOOR_HALVINGS = 24;

/**
 * The floor of a pumped bench: the smallest current up to `upTo_mA` at which the crystal lases, mA;
 * Infinity where none does. More current also warms the pump off the line, so the absorbed light
 * need not grow: the search climbs in steps to the first one that lases and halves that step. About
 * 70 exponentials a call; a judge at a high rate keeps a table.
 */
export function crystalFloor_mA(
  diode: DiodePart,
  crystal: CrystalPart,
  case_degC: number,
  upTo_mA: number,
): number {
  let below = threshold_mA(diode, case_degC);
  const step = (upTo_mA - below) / FLOOR_STEPS;
  if (!(step > 0)) return Number.POSITIVE_INFINITY;
  const lases = (current_mA: number): boolean =>
    absorbed_mW(diode, crystal, current_mA, case_degC) >= crystal.threshold_mW;
  let above = below + step;
  let tries = 1;
  while (!lases(above)) {
    if (tries === FLOOR_STEPS) return Number.POSITIVE_INFINITY;
    below = above;
    above += step;
    tries += 1;
  }
  for (let n = 0; n < FLOOR_HALVINGS; n += 1) {
    const middle = (below + above) / 2;
    if (lases(middle)) above = middle;
    else below = middle;
  }
  return above;
}

/** Current under which the bench gives no laser light, mA: the crystal's floor, or the diode's. */
export function floor_mA(
  diode: DiodePart,
  crystal: CrystalPart | null,
  case_degC: number,
  upTo_mA: number,
): number {
  if (crystal === null) return threshold_mA(diode, case_degC);
  return crystalFloor_mA(diode, crystal, case_degC, upTo_mA);
}
