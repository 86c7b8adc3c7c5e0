/** One measured quantity, as the controller's introduction describes it. */
export interface Channel {
  readonly index: number;
  /** `set`, `current`, `case`, `photodiode` are judged; others are recorded whatever they are. */
  readonly name: string;
  /** Unit of one scaled count (`mA`, `degC`, `V`, `adc`, `ratio`). */
  readonly unit: string;
  /** Unit per count. value = count × perCount, before any conversion of the bench file. */
  readonly perCount: number;
  /** Smallest and largest count the converter can give; outside is nonsense. */
  readonly count_min: number;
  readonly count_max: number;
  /** 0 is the judge's group, in every sample; 1–15 come in turn. */
  readonly group: number;
  /**
   * Set where counts × perCount is the value itself: numbers brought in from elsewhere, which no
   * conversion of a bench file may touch.
   */
  readonly inUnit?: true;
}

/** What the controller said of itself, complete and checked. */
export interface Manifest {
  /** CRC-32 over the introduction's channel lines; identifies this manifest in the record. */
  readonly id: string;
  readonly protocol: number;
  readonly firmware: string;
  readonly serial: string;
  readonly boot: number;
  /** Controller tick, microseconds. */
  readonly tick_us: number;
  /** The board's own absolute ceiling, counts of the set-current channel. */
  readonly absolute_counts: number;
  /** CRC-32 of the curve the board holds; "00000000" while it holds none. */
  readonly curveCrc: string;
  readonly term_ticks_min: number;
  readonly term_ticks_max: number;
  /** Time of the output stage from full current to dark, milliseconds. */
  readonly fall_ms: number;
  /** Samples per second the board sends. */
  readonly rate_perS: number;
  /** `dither`, `cool`, `shutter`, `inject`, `hand`, `toggle`. */
  readonly capabilities: readonly string[];
  readonly channels: readonly Channel[];
}

/** Channel of that name, or undefined. */
export const channelNamed = (m: Manifest, name: string): Channel | undefined =>
  m.channels.find((c) => c.name === name);
