/**
 * A second instrument beside the bench, such as a power meter, that answers the published standard
 * for instrument commands. What it reads is recorded and compared; it never feeds a permit.
 */
export interface WitnessSpec {
  /** Its readings are the channel `witness.NAME`. */
  readonly name: string;
  readonly address:
    | { readonly kind: "tcp"; readonly host: string; readonly port: number }
    | { readonly kind: "serial"; readonly path: string; readonly baud: number };
  /** The question that it answers with one number, such as `MEAS:POW?`. */
  readonly query: string;
  /** Unit in which readings are kept, and how many of it are one of the instrument's. */
  readonly unit: string;
  readonly perRead: number;
  readonly period_ms: number;
  /** Days of its calibration, as `2026-03-01`; null where not told. */
  readonly calibrated: string | null;
  readonly due: string | null;
}

/** What is known of a witness's calibration, in words; empty where nothing is. */
export function calibrationWords({ calibrated, due }: WitnessSpec): string {
  const parts = [
    ...(calibrated === null ? [] : [`calibrated ${calibrated}`]),
    ...(due === null ? [] : [`due ${due}`]),
  ];
  return parts.join(", ");
}
