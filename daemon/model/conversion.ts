/**
 * How raw counts become a unit. Plain data, versioned: a better calibration is a new conversion, and
 * old nights are re-read with it. `physics/convert.ts` evaluates it; nothing else turns counts into
 * units.
 */
export type Law =
  /** value = count × perCount + offset, in the channel's unit. */
  | { readonly kind: "linear"; readonly perCount: number; readonly offset: number }
  /** Thermistor in a divider read by a ratiometric converter; see `DividerPlace`. */
  | {
      readonly kind: "ntc";
      readonly divider: Divider;
      /** Resistance at 25 °C, ohm, and beta, kelvin. */
      readonly r25_ohm: number;
      readonly beta_K: number;
    }
  | {
      readonly kind: "steinhart-hart";
      readonly divider: Divider;
      readonly a: number;
      readonly b: number;
      readonly c: number;
    }
  /** Platinum resistor to IEC 60751, of that resistance at 0 °C. */
  | { readonly kind: "platinum"; readonly divider: Divider; readonly r0_ohm: number };

/** A resistor to supply and a sensor to ground, or the other way round. */
export interface Divider {
  readonly fixed_ohm: number;
  readonly sensor: "to-ground" | "to-supply";
  /** Counts that stand for the full supply (1024 for a 10-bit converter). */
  readonly full_counts: number;
  /** For telling how much the divider's own current warms the sensor; absent where not known. */
  readonly heating?: { readonly supply_mV: number; readonly dissipation_mWperK: number };
}

export interface Conversion {
  /** Counts up with each calibration; recorded beside every session. */
  readonly version: number;
  readonly law: Law;
  /** Half width of the reading's stated error, in the channel's unit. */
  readonly error: number;
}
