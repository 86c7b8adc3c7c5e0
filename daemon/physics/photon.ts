/** Photon arithmetic. Constants are exact in the SI since 2019. */
export const PLANCK_Js = 6.62607015e-34;
export const LIGHT_mPerS = 299_792_458;
export const CHARGE_C = 1.602176634e-19;

/** h·c/e, electronvolt times nanometre. */
export const HC_OVER_E_eVnm = ((PLANCK_Js * LIGHT_mPerS) / CHARGE_C) * 1e9;

/** Energy of one photon, eV; also the slope in W/A of a diode of one photon per electron. */
export const photon_eV = (wavelength_nm: number): number => HC_OVER_E_eVnm / wavelength_nm;

/** Photocurrent per power of a detector, A/W, of that quantum efficiency (0 to 1). */
export const responsivity_AperW = (wavelength_nm: number, efficiency: number): number =>
  (efficiency * wavelength_nm) / HC_OVER_E_eVnm;

/** Light on a detector, mW, from its photocurrent. */
export const fromPhotocurrent_mW = (current_mA: number, responsivity_AperW: number): number =>
  current_mA / responsivity_AperW;

/** Differential quantum efficiency of a slope in W/A. */
export const differentialEfficiency = (slope_WperA: number, wavelength_nm: number): number =>
  slope_WperA / photon_eV(wavelength_nm);

/** Share of each absorbed pump photon that must become heat. */
export const quantumDefect = (pump_nm: number, output_nm: number): number =>
  1 - pump_nm / output_nm;
