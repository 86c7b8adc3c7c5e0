import type { Conversion } from "./conversion.ts";
import type { StreamSpec } from "./stream.ts";
import type { WitnessSpec } from "./witness.ts";

/**
 * A bench file, parsed: every value checked, in one unit, with defaults filled in. bench-file/ makes
 * it from text; judge/ compiles it into a plan; nothing downstream checks it again.
 */
export interface Bench {
  readonly name: string;
  readonly title: string;
  readonly light: "continuous";
  readonly controller: ControllerPart;
  readonly diode: DiodePart;
  readonly crystal: CrystalPart | null;
  /** How heat leaves the case; null where nobody has measured or guessed it. */
  readonly cooling: CoolingPart | null;
  readonly limits: LimitsPart;
  /** Case temperature ascending, current not rising; between points linear, beyond the ends flat
   * below the first and zero above the last. */
  readonly derating: readonly DeratingPoint[];
  /** How the judged channels become units; a channel not listed uses the manifest's own scale. */
  readonly conversions: Readonly<Record<string, Conversion>>;
  readonly hazards: Readonly<Record<HazardId, HazardLevels>>;
  readonly protections: ProtectionsPart;
  readonly record: RecordPart;
  /** Second instruments; none where left out. */
  readonly witnesses?: readonly WitnessSpec[];
}

export type TransportSpec =
  | { readonly kind: "serial"; readonly path: string; readonly baud: number }
  | { readonly kind: "tcp"; readonly host: string; readonly port: number }
  | { readonly kind: "built-in"; readonly seed: number };

export interface ControllerPart {
  readonly transport: TransportSpec;
  /** Serial number the board must have; null accepts the first one met and latches on change. */
  readonly serial: string | null;
  /** Samples per second wanted; the manifest must offer at least this. */
  readonly rate_perS: number;
  readonly term_ms: number;
  /** How its lines are read, where it has firmware of its own and is only watched. */
  readonly stream?: StreamSpec;
}

export interface DiodePart {
  readonly wavelength_nm: number;
  /** Exponential laws, common practice: Ith = threshold · exp((T−ref)/T0), η = slope · exp(−(T−ref)/T1). */
  readonly threshold_mA: number;
  readonly slope_mWpermA: number;
  readonly ref_degC: number;
  readonly t0_K: number;
  readonly t1_K: number;
  /** V = v0 + rs·I; null where forward voltage is not known. */
  readonly v0_mV: number | null;
  readonly rs_ohm: number | null;
  readonly absolute_mA: number;
  /** Junction to case, and the junction's limit; null where the sheet gives none. */
  readonly rjc_KperW: number | null;
  readonly junction_degC_max: number | null;
}

/** A crystal pumped by the diode. Pump wavelength drifts across its absorption line. */
export interface CrystalPart {
  readonly wavelength_nm: number;
  /** Absorbed pump power at which it lases, mW, and output per absorbed pump above that, mW/mW. */
  readonly threshold_mW: number;
  readonly slope: number;
  readonly line_nm: number;
  readonly lineWidth_nm: number;
  /** Peak absorption times length, dimensionless. */
  readonly depth: number;
  readonly pumpDrift_nmPerK: number;
}

/** Two nodes: the case (with what is bolted to it), and the sink, which gives its heat to the room. */
export interface CoolingPart {
  readonly caseToSink_KperW: number;
  readonly sinkToRoom_KperW: number;
  readonly case_JperK: number;
  readonly sink_JperK: number;
}

export interface LimitsPart {
  readonly current_mA: number;
  readonly slewUp_mAperS: number;
  /** Zero current under live permits before the bench goes back to standby, milliseconds. */
  readonly darkTime_ms: number;
  /** A capped aim comes back only after the case has been this much cooler for this long. */
  readonly recover_K: number;
  readonly recover_ms: number;
}

export interface DeratingPoint {
  readonly case_degC: number;
  readonly current_mA: number;
}

/** Rows of the hazard table so far. The table itself, with words and causes, is in judge/. */
export const HAZARD_IDS = [
  "over-ceiling",
  "follow-high",
  "follow-low",
  "case-over",
  "case-open",
  "case-short",
  "sensor-range",
  "sample-gap",
  "tick-drift",
  "controller-reset",
  "key",
  "loop",
  "dark-current",
  "dark-light",
  "output-low",
  "margin-low",
  "permit-age",
  "curve-differs",
  "dark-time",
  "link-lost",
] as const;
export type HazardId = (typeof HAZARD_IDS)[number];

/**
 * Levels of one row, in the row's own unit (hazard-rows.ts says which); null means that the row has
 * no such action. Delays are milliseconds of standing beyond the level; deadband is in the row's
 * unit, or in kelvin for a temperature. A row that is a plain fact (key off) has level 1.
 */
export interface HazardLevels {
  readonly warn: number | null;
  readonly warnDelay_ms: number;
  readonly trip: number | null;
  readonly tripDelay_ms: number;
  readonly deadband: number;
  /** Process safety time: longest from the hazard to dark, milliseconds. */
  readonly safety_ms: number;
}

/** What the bench has in hardware, as its owner states it. */
export interface ProtectionsPart {
  readonly key: boolean;
  readonly interlockLoop: boolean;
  readonly emissionWarning: boolean;
  readonly beamStop: boolean;
  readonly manualReset: boolean;
  readonly toggledEnable: boolean;
}

/** How the record is kept, beside what every record does. */
export interface RecordPart {
  /** A server that keeps the record a second time; null where there is none. */
  readonly influx: InfluxPart | null;
}

/** User and password never stand here: they come from the environment or a file of mode 0600. */
export interface InfluxPart {
  readonly url: string;
  readonly database: string;
  readonly server: "influxdb" | "victoria-metrics";
  /** How long the server is asked to keep what it gets; null for ever. */
  readonly keep_ms: number | null;
  /** PEM file of the authority that signed the server's certificate; null for the system's own. */
  readonly caFile: string | null;
  /** File with user and password; null for the one in the data folder. */
  readonly credentialsFile: string | null;
  /** Where the pages read older samples and events. */
  readonly pages: "record" | "influx";
}
