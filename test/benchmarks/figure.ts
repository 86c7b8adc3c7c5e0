/** One measured figure, as `npm run bench -- --json FILE` writes it. */
export interface Figure {
  /** Dotted and stable. */
  readonly name: string;
  readonly value: number;
  readonly unit: string;
  /** What it is measured against, in the same run. */
  readonly peer?: string;
  /** How many times better than the peer; above 1 is better. */
  readonly ratio?: number;
}

/** The middle of several measurements. */
export function median(values: readonly number[]): number {
  const sorted = [...values].sort((a, b) => a - b);
  return sorted[Math.floor(sorted.length / 2)] ?? Number.NaN;
}
