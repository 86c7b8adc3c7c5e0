import type { Conversion, Divider, Law } from "../model/conversion.ts";

/**
 * The only place that turns counts into units and back. Functions on numbers, without allocation:
 * the judge calls them for every sample.
 */

/** 0 °C in kelvin (ITS-90). */
export const ZERO_K = 273.15;
/** Reference temperature of a thermistor's nominal resistance, 25 °C in kelvin. */
const NTC_REF_K = 298.15;

/** IEC 60751: R = R0·(1 + A·T + B·T² + C·(T − 100)·T³), the last term only below 0 °C. */
const PLATINUM_A = 3.9083e-3;
const PLATINUM_B = -5.775e-7;
const PLATINUM_C = -4.183e-12;
/** Range of IEC 60751; outside it the law says nothing and the reading is not finite. */
export const PLATINUM_degC_MIN = -200;
export const PLATINUM_degC_MAX = 850;

/** 1 where a higher count means a higher value, −1 where it means a lower one. */
export function direction(law: Law): 1 | -1 {
  if (law.kind === "linear") return law.perCount < 0 ? -1 : 1;
  const resistanceRises = law.kind === "platinum";
  return (law.divider.sensor === "to-ground") === resistanceRises ? 1 : -1;
}

/**
 * Value of a count (a mean of counts may be fractional) in the channel's unit.
 *
 * Thermistors and platinum: −Infinity or +Infinity outside what the law can say (an open or shorted
 * sensor), in the direction in which the reading ran away. Never NaN for a finite count.
 */
export function toUnit(conversion: Conversion, count: number): number {
  return lawToUnit(conversion.law, count);
}

/** The same for a law that stands alone. */
export function lawToUnit(law: Law, count: number): number {
  switch (law.kind) {
    case "linear":
      return count * law.perCount + law.offset;
    case "ntc":
      return ntc_degC(sensor_ohm(law.divider, count), law.r25_ohm, law.beta_K);
    case "steinhart-hart":
      return steinhartHart_degC(sensor_ohm(law.divider, count), law.a, law.b, law.c);
    case "platinum":
      return platinum_degC(sensor_ohm(law.divider, count), law.r0_ohm);
    default:
      return law satisfies never;
  }
}

/** Count, not rounded, at which the law gives that value: the inverse of `lawToUnit`. */
export function lawToCount(law: Law, value: number): number {
  switch (law.kind) {
    case "linear":
      return (value - law.offset) / law.perCount;
    case "ntc":
      return dividerCount(law.divider, ntc_ohm(value, law.r25_ohm, law.beta_K));
    case "steinhart-hart":
      return dividerCount(law.divider, steinhartHart_ohm(value, law.a, law.b, law.c));
    case "platinum":
      return dividerCount(law.divider, platinum_ohm(value, law.r0_ohm));
    default:
      return law satisfies never;
  }
}

/** Share of the divider's voltage that falls on the sensor, 0 (shorted) to 1 (open). */
export function sensorShare(divider: Divider, count: number): number {
  const share = count / divider.full_counts;
  return divider.sensor === "to-ground" ? share : 1 - share;
}

/** Resistance of the sensor, ohm; 0 where shorted, Infinity where open. */
export function sensor_ohm(divider: Divider, count: number): number {
  const share = sensorShare(divider, count);
  if (share <= 0) return 0;
  if (share >= 1) return Number.POSITIVE_INFINITY;
  return (divider.fixed_ohm * share) / (1 - share);
}

/** Count of a divider whose sensor has that resistance. */
export function dividerCount(divider: Divider, ohm: number): number {
  const share = ohm === Number.POSITIVE_INFINITY ? 1 : ohm / (ohm + divider.fixed_ohm);
  return divider.full_counts * (divider.sensor === "to-ground" ? share : 1 - share);
}

/** Beta law: R = R25·exp(B·(1/T − 1/298.15 K)). */
export function ntc_ohm(degC: number, r25_ohm: number, beta_K: number): number {
  return r25_ohm * Math.exp(beta_K * (1 / (degC + ZERO_K) - 1 / NTC_REF_K));
}

export function ntc_degC(ohm: number, r25_ohm: number, beta_K: number): number {
  return fromInverse_K(1 / NTC_REF_K + Math.log(ohm / r25_ohm) / beta_K);
}

/** Steinhart and Hart 1968: 1/T = A + B·ln R + C·(ln R)³. */
export function steinhartHart_degC(ohm: number, a: number, b: number, c: number): number {
  if (ohm <= 0) return Number.POSITIVE_INFINITY;
  if (ohm === Number.POSITIVE_INFINITY) return Number.NEGATIVE_INFINITY;
  const ln = Math.log(ohm);
  return fromInverse_K(a + b * ln + c * ln * ln * ln);
}

/** Inverse of the Steinhart–Hart law, for b > 0 and c ≥ 0, where the cubic has one real root. */
export function steinhartHart_ohm(degC: number, a: number, b: number, c: number): number {
  const y = 1 / (degC + ZERO_K) - a;
  if (c === 0) return Math.exp(y / b);
  const p = b / (3 * c);
  const q = y / (2 * c);
  const root = Math.sqrt(p * p * p + q * q);
  // For the sign that would subtract two nearly equal numbers, use that the product of both is p.
  const big = Math.cbrt(Math.abs(q) + root);
  const ln = Math.sign(q) * (big - p / big);
  return Math.exp(ln);
}

/** A temperature from 1/T: 1/T at or under zero is hotter than any, infinite 1/T colder than any. */
function fromInverse_K(inverse: number): number {
  if (inverse === Number.POSITIVE_INFINITY) return Number.NEGATIVE_INFINITY;
  if (inverse <= 0) return Number.POSITIVE_INFINITY;
  return 1 / inverse - ZERO_K;
}

/** IEC 60751. Outside −200 … 850 °C the same polynomial, which `platinum_degC` does not invert. */
export function platinum_ohm(degC: number, r0_ohm: number): number {
  const c = degC < 0 ? PLATINUM_C * (degC - 100) * degC * degC * degC : 0;
  return r0_ohm * (1 + PLATINUM_A * degC + PLATINUM_B * degC * degC + c);
}

export function platinum_degC(ohm: number, r0_ohm: number): number {
  const ratio = ohm / r0_ohm;
  if (ratio < platinum_ohm(PLATINUM_degC_MIN, 1)) return Number.NEGATIVE_INFINITY;
  if (ratio > platinum_ohm(PLATINUM_degC_MAX, 1)) return Number.POSITIVE_INFINITY;
  const square = PLATINUM_A * PLATINUM_A - 4 * PLATINUM_B * (1 - ratio);
  let degC = (Math.sqrt(square) - PLATINUM_A) / (2 * PLATINUM_B);
  if (ratio >= 1) return degC;
  // Below zero the quadratic is 2.4 K off at worst and Newton's step squares the error: four are
  // enough for every digit of a double.
  for (let n = 0; n < 4; n += 1) {
    const cubic = PLATINUM_C * (4 * degC - 300) * degC * degC;
    const slope = PLATINUM_A + 2 * PLATINUM_B * degC + cubic;
    degC -= (platinum_ohm(degC, 1) - ratio) / slope;
  }
  return degC;
}

/**
 * How much a divider's own current warms its sensor: V²/(R·δ), kelvin.
 * @param dissipation_mWperK the sensor's dissipation constant in the place where it sits
 */
export function selfHeating_K(
  supply_mV: number,
  fixed_ohm: number,
  ohm: number,
  dissipation_mWperK: number,
): number {
  const sensor_mV = (supply_mV * ohm) / (ohm + fixed_ohm);
  // 1 mV²/ohm is 1e-6 W, which is 1e-3 mW.
  const heat_mW = (sensor_mV * sensor_mV * 1e-3) / ohm;
  return heat_mW / dissipation_mWperK;
}
