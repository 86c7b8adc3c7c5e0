import { readFileSync } from "node:fs";
import { describe, expect, test } from "vitest";
import {
  ntc_degC,
  ntc_ohm,
  platinum_degC,
  platinum_ohm,
  steinhartHart_degC,
  steinhartHart_ohm,
} from "../../daemon/physics/convert.ts";

/**
 * Thermistors and platinum against data/temperature-sensors.json. The platinum table is IEC 60751
 * (quoted from memory, every value equal to the standard's polynomial); thermistor values are
 * computed from the beta equation and from Steinhart and Hart 1968, nothing published behind them,
 * but for the widely quoted coefficient set for a 10 kohm thermistor.
 */
interface Data {
  ntc_beta: { B_K: number; R25_ohm: number; T_C: number; R_ohm: number }[];
  steinhart_hart: {
    coefficients_A_B_C: [number, number, number];
    widely_quoted_coefficients: [number, number, number];
    R_to_T: { R_ohm: number; T_C: number }[];
    T_to_R: { R_ohm: number; T_C: number }[];
    widely_quoted_R_to_T: { R_ohm: number; T_C: number }[];
  };
  pt100: { forward: { T_C: number; R_ohm: number; table: number }[] };
  tolerance: { computed_relative: number; pt100_table_ohm: number };
}
const file = new URL("./data/temperature-sensors.json", import.meta.url);
const data: Data = JSON.parse(readFileSync(file, "utf8"));
const near = (got: number, want: number, relative: number): void =>
  expect(Math.abs(got - want)).toBeLessThanOrEqual(relative * Math.max(1, Math.abs(want)));

describe("beta equation (computed)", () => {
  test.each(data.ntc_beta)("B $B_K K at $T_C °C is $R_ohm ohm", ({ B_K, R25_ohm, T_C, R_ohm }) => {
    near(ntc_ohm(T_C, R25_ohm, B_K), R_ohm, data.tolerance.computed_relative);
    near(ntc_degC(R_ohm, R25_ohm, B_K), T_C, data.tolerance.computed_relative);
  });
});

describe("Steinhart–Hart equation (computed; coefficients through three points)", () => {
  const [a, b, c] = data.steinhart_hart.coefficients_A_B_C;
  test.each(data.steinhart_hart.R_to_T)("$R_ohm ohm is $T_C °C", ({ R_ohm, T_C }) => {
    near(steinhartHart_degC(R_ohm, a, b, c), T_C, data.tolerance.computed_relative);
  });
  test.each(data.steinhart_hart.T_to_R)("$T_C °C is $R_ohm ohm", ({ R_ohm, T_C }) => {
    near(steinhartHart_ohm(T_C, a, b, c), R_ohm, data.tolerance.computed_relative);
  });
  const [qa, qb, qc] = data.steinhart_hart.widely_quoted_coefficients;
  test.each(data.steinhart_hart.widely_quoted_R_to_T)(
    "widely quoted coefficients: $R_ohm ohm is $T_C °C",
    ({ R_ohm, T_C }) => near(steinhartHart_degC(R_ohm, qa, qb, qc), T_C, 1e-9),
  );
});

describe("platinum, IEC 60751", () => {
  test.each(data.pt100.forward)("$T_C °C is $table ohm", ({ T_C, R_ohm, table }) => {
    expect(Math.abs(platinum_ohm(T_C, 100) - table)).toBeLessThan(data.tolerance.pt100_table_ohm);
    near(platinum_ohm(T_C, 100), R_ohm, data.tolerance.computed_relative);
    // The ends of the range may fall outside by the last bit; a millikelvin inside is inside.
    if (T_C > -200 && T_C < 850) near(platinum_degC(R_ohm, 100), T_C, 1e-9);
  });
});
