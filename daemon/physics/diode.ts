import type { DeratingPoint, DiodePart } from "../model/bench.ts";

/**
 * Laws of a laser diode at a case temperature, as the trade writes them: exponential threshold and
 * efficiency, a straight forward voltage. Functions on numbers, without allocation.
 */

/** Threshold current: Ith = threshold · exp((T − ref) / T0), mA. */
export function threshold_mA(diode: DiodePart, case_degC: number): number {
  return diode.threshold_mA * Math.exp((case_degC - diode.ref_degC) / diode.t0_K);
}

/** Differential efficiency: η = slope · exp(−(T − ref) / T1), mW/mA. */
export function slope_mWpermA(diode: DiodePart, case_degC: number): number {
  return diode.slope_mWpermA * Math.exp(-(case_degC - diode.ref_degC) / diode.t1_K);
}

/** Light of the diode, mW; zero below threshold (its spontaneous light is not counted). */
export function power_mW(diode: DiodePart, current_mA: number, case_degC: number): number {
  const above_mA = current_mA - threshold_mA(diode, case_degC);
  return above_mA > 0 ? slope_mWpermA(diode, case_degC) * above_mA : 0;
}

/** Forward voltage V0 + Rs·I, mV; NaN where the bench file does not know it. Zero at no current. */
export function forward_mV(diode: DiodePart, current_mA: number): number {
  if (diode.v0_mV === null || diode.rs_ohm === null) return Number.NaN;
  return current_mA > 0 ? diode.v0_mV + diode.rs_ohm * current_mA : 0;
}

/** Heat that the diode leaves in the case, V·I − P, mW; NaN where the voltage is not known. */
export function heat_mW(diode: DiodePart, current_mA: number, case_degC: number): number {
  const electrical_mW = (forward_mV(diode, current_mA) * current_mA) / 1000;
  return electrical_mW - power_mW(diode, current_mA, case_degC);
}

/** Junction temperature with that heat in it, °C; NaN where its thermal resistance is not known. */
export function junction_degC(diode: DiodePart, case_degC: number, heat_mW: number): number {
  if (diode.rjc_KperW === null) return Number.NaN;
  return case_degC + (diode.rjc_KperW * heat_mW) / 1000;
}

/**
 * Largest current that keeps the junction at its limit with no light leaving, mA. When light fails,
 * its power becomes heat, so the limit never counts on it. Infinity where the data sheet gives no
 * limit, resistance or voltage; zero where the case alone is at the limit.
 */
export function junctionLimited_mA(diode: DiodePart, case_degC: number): number {
  const room_uW = junctionRoom_uW(diode, case_degC);
  if (diode.v0_mV === null || diode.rs_ohm === null || !Number.isFinite(room_uW)) {
    return Number.POSITIVE_INFINITY;
  }
  if (room_uW <= 0) return 0;
  return smallerPositiveRoot(diode.rs_ohm, diode.v0_mV, -room_uW);
}

/**
 * The same with the light of a healthy diode leaving. For showing what is lost, never for limiting.
 */
export function junctionLimitedLit_mA(diode: DiodePart, case_degC: number): number {
  const dark_mA = junctionLimited_mA(diode, case_degC);
  const start_mA = threshold_mA(diode, case_degC);
  if (!Number.isFinite(dark_mA) || dark_mA <= start_mA) return dark_mA;
  const eta_mV = 1000 * slope_mWpermA(diode, case_degC);
  const constant = eta_mV * start_mA - junctionRoom_uW(diode, case_degC);
  const root = smallerPositiveRoot(diode.rs_ohm ?? 0, (diode.v0_mV ?? 0) - eta_mV, constant);
  return Number.isNaN(root) ? Number.POSITIVE_INFINITY : root;
}

/** Heat that may still flow from junction to case, µW (mV·mA); Infinity where no limit is known. */
function junctionRoom_uW(diode: DiodePart, case_degC: number): number {
  if (diode.rjc_KperW === null || diode.junction_degC_max === null) {
    return Number.POSITIVE_INFINITY;
  }
  return ((diode.junction_degC_max - case_degC) / diode.rjc_KperW) * 1e6;
}

/** Smaller positive root of a·x² + b·x + c, or NaN where there is none. Stable for small a. */
export function smallerPositiveRoot(a: number, b: number, c: number): number {
  if (a === 0) return positive(-c / b);
  const square = b * b - 4 * a * c;
  if (square < 0) return Number.NaN;
  const half = -0.5 * (b + (b < 0 ? -1 : 1) * Math.sqrt(square));
  const one = positive(half / a);
  const other = positive(c / half);
  if (Number.isNaN(one)) return other;
  if (Number.isNaN(other)) return one;
  return Math.min(one, other);
}

const positive = (x: number): number => (x > 0 && Number.isFinite(x) ? x : Number.NaN);

/**
 * Current that the derating allows, mA: straight between points, level below the first, zero above
 * the last and for a temperature that is not a number.
 */
export function derated_mA(points: readonly DeratingPoint[], case_degC: number): number {
  const first = points[0];
  if (first === undefined || Number.isNaN(case_degC)) return 0;
  if (case_degC <= first.case_degC) return first.current_mA;
  let before = first;
  for (let n = 1; n < points.length; n += 1) {
    const point = points[n];
    if (point === undefined) return 0;
    if (case_degC <= point.case_degC) {
      const share = (case_degC - before.case_degC) / (point.case_degC - before.case_degC);
      return before.current_mA + share * (point.current_mA - before.current_mA);
    }
    before = point;
  }
  return 0;
}
