import type { ByteReader, ByteWriter } from "./bytes.ts";

/**
 * What is left of a column when each value's prediction from those before it is taken away. All
 * arithmetic is on 32-bit integers that wrap, so whatever the predictor, nothing can be lost; a
 * running mean with a shift is chosen only where nothing wraps, so that a reader need not either.
 *
 * A running mean keeps m, the mean times 2^shift, predicts (m + half) >> shift, and adds what was
 * left to m: an exponential mean over about 2^shift values, at one addition a value. Shift 0 is
 * "the value before".
 */
export const PREDICTOR = { none: 0, line: 1, before: 2, mean: 3 } as const;

export type Prediction =
  | { readonly by: typeof PREDICTOR.none }
  /** Value i is expected at floor(slope × i + 0.5). */
  | { readonly by: typeof PREDICTOR.line; readonly slope: number }
  /** As the value `lag` places before; the first `lag` are expected to be 0. */
  | { readonly by: typeof PREDICTOR.before; readonly lag: number }
  | { readonly by: typeof PREDICTOR.mean; readonly shift: number; readonly start: number };

const SHIFTS = 9;
const LAGS = 9;
/** Values that the choice of a predictor looks at; they are taken from the column's middle. */
const TRIED = 1024;
/** Columns of so few different values are codes or bits: there the entropy is asked, not the size. */
const FEW = 8;

/** Values within ± this leave room for every shift. */
const MEANT_MAX = 2 ** (30 - SHIFTS);
/** What a line leaves of values within ± this fits 32 bits, whatever they are. */
const LINED_MAX = 2 ** 30;

/** Says that the values are taken modulo 2^32 anyway. */
export const ANY_SIZE = Number.POSITIVE_INFINITY;

/**
 * Chooses how to predict the first n values of a column, all within ± `size_max`, by trying it on
 * some of them.
 */
export function choosePrediction(values: Int32Array, n: number, size_max: number): Prediction {
  const from = Math.max(0, (n - TRIED) >> 1);
  const to = Math.min(n, from + TRIED);
  let least = values[from] as number;
  let most = least;
  for (let i = from; i < to; i++) {
    const value = values[i] as number;
    if (value < least) least = value;
    if (value > most) most = value;
  }
  if (most - least < FEW && size_max < MEANT_MAX) return chooseForCodes(values, from, to, least, n);
  const { shift, size } = bestShift(values, from, to, size_max < MEANT_MAX ? SHIFTS : 1);
  const slope = slopeOf(values, n);
  if ((size_max < LINED_MAX || size_max === ANY_SIZE) && lineSize(values, from, to, slope) < size) {
    return { by: PREDICTOR.line, slope };
  }
  return { by: PREDICTOR.mean, shift, start: startOf(values, 0, n, shift) };
}

const slopeOf = (values: Int32Array, n: number): number =>
  ((values[n - 1] as number) - (values[0] as number)) / Math.max(1, n - 1);

/** The running mean starts from the mean of as many values as it spans, not from a noisy first. */
function startOf(values: Int32Array, from: number, to: number, shift: number): number {
  const span = Math.min(to - from, 1 << shift);
  let sum = 0;
  for (let i = from; i < from + span; i++) sum += values[i] as number;
  return Math.round((sum / span) * (1 << shift)) | 0;
}

function bestShift(
  values: Int32Array,
  from: number,
  to: number,
  shifts: number,
): { shift: number; size: number } {
  let best = { shift: 0, size: Number.POSITIVE_INFINITY };
  for (let shift = 0; shift < shifts; shift++) {
    const size = meanSize(values, from, to, shift);
    if (size < best.size) best = { shift, size };
  }
  return best;
}

function meanSize(values: Int32Array, from: number, to: number, shift: number): number {
  const half = (1 << shift) >> 1;
  let m = startOf(values, from, to, shift);
  let size = 0;
  for (let i = from; i < to; i++) {
    const left = ((values[i] as number) - ((m + half) >> shift)) | 0;
    m = (m + left) | 0;
    size += left < 0 ? -left : left;
  }
  return size;
}

function lineSize(values: Int32Array, from: number, to: number, slope: number): number {
  let size = 0;
  for (let i = from; i < to; i++) {
    size += Math.abs(((values[i] as number) - Math.floor(slope * i + 0.5)) | 0);
  }
  return size;
}

function chooseForCodes(
  values: Int32Array,
  from: number,
  to: number,
  least: number,
  n: number,
): Prediction {
  const none = bitsOf(to - from, (i) => (values[from + i] as number) - least);
  let best = none;
  let lag = 0;
  for (let l = 1; l < LAGS && l < to - from; l++) {
    const bits = bitsOf(to - from - l, (i) => {
      return (values[from + i + l] as number) - (values[from + i] as number) + FEW;
    });
    if (bits < best * 0.99) {
      best = bits;
      lag = l;
    }
  }
  // Noise of a few steps only: a running mean may still be better.
  const { shift } = bestShift(values, from, to, SHIFTS);
  let m = startOf(values, from, to, shift);
  const bits = bitsOf(to - from, (i) => {
    const rest = (values[from + i] as number) - ((m + ((1 << shift) >> 1)) >> shift);
    m += rest;
    return rest + FEW;
  });
  if (bits < best) return { by: PREDICTOR.mean, shift, start: startOf(values, 0, n, shift) };
  return lag === 0 ? { by: PREDICTOR.none } : { by: PREDICTOR.before, lag };
}

const tally = new Uint32Array(2 * FEW + 1);

/** Bits a value of a stretch of small codes, by their frequencies. */
function bitsOf(count: number, code: (i: number) => number): number {
  tally.fill(0);
  for (let i = 0; i < count; i++) {
    const c = code(i);
    tally[c] = (tally[c] as number) + 1;
  }
  let bits = 0;
  for (const c of tally) if (c > 0) bits -= c * Math.log2(c / count);
  return count === 0 ? 0 : bits / count;
}

/** What is left of the first n values. */
export function takeAway(values: Int32Array, n: number, how: Prediction, left: Int32Array): void {
  if (how.by === PREDICTOR.none) {
    left.set(values.subarray(0, n));
  } else if (how.by === PREDICTOR.line) {
    for (let i = 0; i < n; i++) {
      left[i] = (values[i] as number) - Math.floor(how.slope * i + 0.5);
    }
  } else if (how.by === PREDICTOR.before) {
    const { lag } = how;
    for (let i = 0; i < n; i++) {
      left[i] = (values[i] as number) - (i < lag ? 0 : (values[i - lag] as number));
    }
  } else {
    const { shift } = how;
    const half = (1 << shift) >> 1;
    let m = how.start | 0;
    for (let i = 0; i < n; i++) {
      const rest = ((values[i] as number) - ((m + half) >> shift)) | 0;
      left[i] = rest;
      m = (m + rest) | 0;
    }
  }
}

/** Puts the prediction back, in place: the inverse of `takeAway`. */
export function putBack(left: Int32Array, n: number, how: Prediction): void {
  if (how.by === PREDICTOR.line) {
    for (let i = 0; i < n; i++) left[i] = (left[i] as number) + Math.floor(how.slope * i + 0.5);
  } else if (how.by === PREDICTOR.before) {
    const { lag } = how;
    for (let i = lag; i < n; i++) left[i] = (left[i] as number) + (left[i - lag] as number);
  } else if (how.by === PREDICTOR.mean) {
    const { shift } = how;
    const half = (1 << shift) >> 1;
    let m = how.start | 0;
    for (let i = 0; i < n; i++) {
      const rest = left[i] as number;
      left[i] = ((m + half) >> shift) + rest;
      m = (m + rest) | 0;
    }
  }
}

export function writePrediction(to: ByteWriter, how: Prediction): void {
  if (how.by === PREDICTOR.line) to.f64(how.slope);
  else if (how.by === PREDICTOR.before) to.varint(how.lag);
  else if (how.by === PREDICTOR.mean) {
    to.u8(how.shift);
    to.signed(how.start);
  }
}

/** Reads what `writePrediction` wrote; any `by` that is none of these is taken as none. */
export function readPrediction(from: ByteReader, by: number): Prediction {
  if (by === PREDICTOR.line) return { by, slope: from.f64() };
  if (by === PREDICTOR.before) return { by, lag: Math.max(1, from.varint()) };
  if (by === PREDICTOR.mean) return { by, shift: from.u8() & 31, start: from.signed() };
  return { by: PREDICTOR.none };
}
