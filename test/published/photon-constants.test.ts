import { readFileSync } from "node:fs";
import { describe, expect, test } from "vitest";
import {
  differentialEfficiency,
  fromPhotocurrent_mW,
  HC_OVER_E_eVnm,
  photon_eV,
  quantumDefect,
  responsivity_AperW,
} from "../../daemon/physics/photon.ts";

/**
 * Photon arithmetic against data/photon-constants.json: constants exact in the SI since 2019
 * (CODATA 2018), the rest computed from textbook formulas.
 */
interface Data {
  constants: { hc_over_e_eV_nm: number };
  photon: Record<string, number>[];
  differential_efficiency: Record<string, number>[];
  quantum_defect: { pump_nm: number; laser_nm: number; quantum_defect: number }[];
  photodiode: {
    wavelength_nm: number;
    quantum_efficiency: number;
    responsivity_A_per_W: number;
    current_uA: number;
    power_uW: number;
  }[];
}
const file = new URL("./data/photon-constants.json", import.meta.url);
const data: Data = JSON.parse(readFileSync(file, "utf8"));
const near = (got: number, want: number | undefined): void => {
  expect(want).toBeDefined();
  expect(Math.abs(got / (want ?? Number.NaN) - 1)).toBeLessThan(1e-9);
};

test("hc/e from the exact constants", () => near(HC_OVER_E_eVnm, data.constants.hc_over_e_eV_nm));

describe("photons", () => {
  test.each(data.photon)("$wavelength_nm nm", (row) => {
    const wavelength = row.wavelength_nm ?? Number.NaN;
    near(photon_eV(wavelength), row.energy_eV);
    near(responsivity_AperW(wavelength, 1), row["A_per_W_at_unit_quantum_efficiency (detection)"]);
  });
  test.each(data.differential_efficiency)("$slope_W_per_A W/A at $wavelength_nm nm", (row) => {
    const got = differentialEfficiency(row.slope_W_per_A ?? 0, row.wavelength_nm ?? 0);
    near(got, row.differential_quantum_efficiency);
  });
  test.each(data.quantum_defect)("$pump_nm to $laser_nm nm", (row) => {
    near(quantumDefect(row.pump_nm, row.laser_nm), row.quantum_defect);
  });
  test.each(data.photodiode)("$current_uA uA at $wavelength_nm nm", (row) => {
    const responsivity = responsivity_AperW(row.wavelength_nm, row.quantum_efficiency);
    near(responsivity, row.responsivity_A_per_W);
    near(1000 * fromPhotocurrent_mW(row.current_uA / 1000, responsivity), row.power_uW);
  });
});
