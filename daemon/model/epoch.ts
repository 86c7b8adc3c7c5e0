/** What of a bench a person can change for another. A new epoch of that part begins then. */
export const EPOCH_PARTS = [
  "diode",
  "crystal",
  "optics",
  "detector",
  "sensor",
  "mount",
  "firmware",
] as const;
export type EpochPart = (typeof EPOCH_PARTS)[number];

/** What is told of a change by hand. Empty texts stand for not told. */
export interface EpochFacts {
  readonly serial: string;
  readonly note: string;
  readonly who: string;
  /** Data-sheet values as they were written, each with its unit: `threshold` is `0.42 A`. */
  readonly values: Readonly<Record<string, string>>;
}

/** The stretch between two changes of one part begins here. */
export interface Epoch extends EpochFacts {
  readonly id: number;
  readonly bench: string;
  readonly part: EpochPart;
  /** Wall time, ms since 1970. */
  readonly at: number;
}

/** A change by hand in one sentence, for the time axis. */
export function epochWords({
  part,
  serial,
  note,
  values,
}: EpochFacts & { part: EpochPart }): string {
  const which = serial === "" ? `Another ${part}` : `Another ${part}, serial ${serial}`;
  const sheet = Object.entries(values).map(([name, value]) => `${name} ${value}`);
  const words = [which, ...sheet].join(", ");
  return note === "" ? `${words}.` : `${words}: ${note.replace(/[.!]+$/, "")}.`;
}
