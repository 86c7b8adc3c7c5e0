/**
 * Bounds of what `init` takes for an answer, in held units: as wide as the bench file's own, since
 * a rare bench is no slip.
 */
export const BOUNDS = {
  baud: [300, 4_000_000],
  rate: [1, 2000],
  length: [200, 12_000],
  current: [1, 100_000],
  slope: [0.01, 10],
  temperature: [-60, 200],
  voltage: [100, 20_000],
  drift: [0, 5],
  resistance: [1, 10_000_000],
  beta: [500, 10_000],
  count: [16, 16_777_216],
  step: [1e-6, 1_000_000],
} as const satisfies Record<string, readonly [number, number]>;
