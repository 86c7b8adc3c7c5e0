/**
 * A controller with firmware of its own that merely prints numbers: how its lines become samples.
 * Such a bench is watched. Nothing here leads to a permit, and no line of it can raise current.
 */

/** How a line carries its numbers. */
export const STREAM_FORMATS = ["csv", "key-value", "json", "labelled"] as const;
export type StreamFormat = (typeof STREAM_FORMATS)[number];

/** What parts the columns of a csv line, by name. A space stands for any run of them. */
export const SEPARATORS = {
  comma: ",",
  semicolon: ";",
  tab: "\t",
  space: " ",
  bar: "|",
} as const;
export type SeparatorName = keyof typeof SEPARATORS;

/** Most columns a stream may map; the rest of a line is left alone. */
export const STREAM_COLUMNS_MAX = 32;
/** Longest line of a stream, bytes: JSON lines are wordy. What is longer is dropped and counted. */
export const STREAM_LINE_BYTES_MAX = 1024;

/** One printed number and the channel it becomes. */
export interface StreamColumn {
  /** `set`, `current`, `case`, `photodiode` are judged; others are recorded whatever they are. */
  readonly channel: string;
  /** Key, label or header name in the line; a number is a place in a csv line, from 1. */
  readonly from: string;
  /** Held unit of the channel (`mA`, `degC`, `mW`, …), or `counts` where a sensor law follows. */
  readonly unit: string;
  /** Printed value that one recorded count stands for. */
  readonly step: number;
  /** Unit per count. */
  readonly perCount: number;
  /** Counts between which a reading can be true, both included. */
  readonly count_min: number;
  readonly count_max: number;
}

/** Lines of the stream's own time, or none: then the moment of reading counts. */
export interface StreamTime {
  readonly from: string;
  /** Milliseconds in one printed unit. */
  readonly unit_ms: number;
}

export interface StreamSpec {
  readonly format: StreamFormat;
  readonly separator: SeparatorName;
  readonly decimals: "point" | "comma";
  readonly time: StreamTime | null;
  /** Text in a line by which a restarted controller is known; empty for none. */
  readonly banner: string;
  readonly columns: readonly StreamColumn[];
  readonly cutOff: CutOff | null;
}

/** A way to cut light that a watched bench names. */
export type CutOff =
  /** A modem line. Static: asserted means cut. Toggled: the judge feeds a retriggerable one-shot. */
  | { readonly kind: "line"; readonly line: "rts" | "dtr"; readonly mode: "static" | "toggled" }
  /** A line of text, and what the controller answers to it. */
  | {
      readonly kind: "text";
      readonly send: string;
      readonly expect: string;
      readonly within_ms: number;
    };

/** A modem line to be asserted or released. */
export interface LevelOrder {
  readonly line: "rts" | "dtr";
  readonly asserted: boolean;
}

/**
 * How far a bench is enforced. permit: light needs a live permit. toggled: light needs the judge's
 * toggling. on-command: light can be cut from here while this computer works. none: only watched.
 */
export const ENFORCEMENTS = ["permit", "toggled", "on-command", "none"] as const;
export type Enforcement = (typeof ENFORCEMENTS)[number];

/** How far a bench with this stream is enforced; undefined is a board of the line protocol. */
export function enforcementOf(stream: StreamSpec | undefined): Enforcement {
  if (stream === undefined) return "permit";
  const { cutOff } = stream;
  if (cutOff === null) return "none";
  return cutOff.kind === "line" && cutOff.mode === "toggled" ? "toggled" : "on-command";
}

/** What is enforced and what is not, in words for a person. */
export function enforcementWords(stream: StreamSpec | undefined): string {
  const cutOff = stream?.cutOff ?? null;
  switch (enforcementOf(stream)) {
    case "permit":
      return "Light needs a permit for every judged sample; without one the board is dark.";
    case "none":
      return "Watched, not enforced: it watches and warns, and nothing here can cut the light.";
    case "toggled":
      return "Watched; light needs the one-shot that the judge's toggling feeds, and ends without it. The current itself is set by the controller's own firmware.";
    case "on-command": {
      const way =
        cutOff?.kind === "line"
          ? `the line ${cutOff.line.toUpperCase()}`
          : `the text "${cutOff?.kind === "text" ? cutOff.send : ""}"`;
      return `Watched; ${way} cuts on command, but not if this computer hangs.`;
    }
    default:
      return "";
  }
}
