/** Something wrong, or worth knowing, about a bench file: what was found, where, and what to do. */
export interface Problem {
  /** An error refuses the file; a warning is told and the bench still loads. */
  readonly level: "error" | "warning";
  /** Stable word for the kind of problem, for scripts. */
  readonly code: string;
  /** Dotted way to the value, `limits.current` or `derating[2].case`; empty for the whole file. */
  readonly path: string;
  /** Where to look, both from 1. */
  readonly line: number;
  readonly column: number;
  readonly found: string;
  readonly wanted: string;
  readonly do: string;
}

/** A problem before its place in the text is known. */
export interface Finding {
  readonly level: Problem["level"];
  readonly code: string;
  readonly path: Path;
  readonly found: string;
  readonly wanted: string;
  readonly do: string;
}

export type Path = readonly (string | number)[];

/** `["derating", 2, "case"]` as people read it: `derating[2].case`. */
export function pathWords(path: Path): string {
  let words = "";
  for (const step of path) {
    if (typeof step === "number") words += `[${step}]`;
    else words += words === "" ? step : `.${step}`;
  }
  return words;
}
