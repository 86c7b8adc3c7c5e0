/**
 * What `init` needs to know to write a bench file: the few numbers that no default can stand in for.
 * Numbers are in the units of their names.
 */
export interface InitAnswers {
  readonly name: string;
  readonly title: string;
  readonly connect:
    | { readonly kind: "serial"; readonly path: string; readonly baud: number }
    | { readonly kind: "tcp"; readonly host: string; readonly port: number };
  /** Serial number of the board, or `any`. */
  readonly board: string;
  readonly rate_perS: number;
  readonly wavelength_nm: number;
  readonly threshold_mA: number;
  readonly slope_mWpermA: number;
  readonly at_degC: number;
  /** Operating current, and the voltage there; null where the sheet gives none. */
  readonly operating_mA: number;
  readonly operating_mV: number | null;
  readonly absolute_mA: number;
  readonly case_degC_min: number;
  readonly case_degC_max: number;
  /** Drift of the wavelength; null where nobody knows it. */
  readonly drift_nmPerK: number | null;
  /** The case sensor; null where the board itself tells °C. */
  readonly thermistor: ThermistorAnswer | null;
  /** Light that one count of the photodiode stands for; null where the board tells it. */
  readonly photodiode_mW: number | null;
  /** Lines that say how the numbers of a board with firmware of its own are read; null for none. */
  readonly stream: readonly string[] | null;
  readonly protections: Readonly<Record<ProtectionKey, boolean>>;
}

export interface ThermistorAnswer {
  readonly r25_ohm: number;
  readonly beta_K: number;
  readonly fixed_ohm: number;
  readonly full_counts: number;
}

export const PROTECTION_KEYS = [
  "key",
  "interlock-loop",
  "emission-warning",
  "beam-stop",
  "manual-reset",
  "toggled-enable",
] as const;
export type ProtectionKey = (typeof PROTECTION_KEYS)[number];

/** Answers that contradict each other, in sentences; empty where a bench can be written. */
export function contradictions(answers: InitAnswers): string[] {
  const found: string[] = [];
  if (answers.threshold_mA >= answers.operating_mA) {
    found.push("The operating current is not above threshold: there would be no laser light.");
  }
  if (answers.operating_mA > answers.absolute_mA) {
    found.push("The operating current is above the absolute maximum.");
  }
  if (answers.case_degC_min >= answers.case_degC_max) {
    found.push("The lowest case temperature is not below the highest.");
  }
  return found;
}
