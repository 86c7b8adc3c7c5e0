import type { Scale } from "./scale.ts";

/** SVG path texts. A value that is not finite breaks a line: nothing is drawn where nothing is known. */

const px = (value: number): string => `${Math.round(value * 10) / 10}`;

export interface Column {
  readonly x: ArrayLike<number>;
  readonly v: ArrayLike<number>;
}

/** A line through the known values. Values under `clamp` run along it, as a line that dropped out. */
export function linePath({ x, v }: Column, y: Scale, clamp = Number.NEGATIVE_INFINITY): string {
  let d = "";
  let down = false;
  for (let i = 0; i < x.length; i++) {
    const value = v[i] ?? Number.NaN;
    if (!Number.isFinite(value)) {
      down = false;
      continue;
    }
    d += `${down ? "L" : "M"}${px(x[i] ?? 0)} ${px(y(Math.max(clamp, value)))}`;
    down = true;
  }
  return d;
}

/** The area between two columns over the same x, in one closed piece a known stretch. */
export function bandPath(
  x: ArrayLike<number>,
  top: ArrayLike<number>,
  bottom: ArrayLike<number>,
  y: Scale,
): string {
  let d = "";
  let start = -1;
  for (let i = 0; i <= x.length; i++) {
    const known =
      i < x.length &&
      Number.isFinite(top[i] ?? Number.NaN) &&
      Number.isFinite(bottom[i] ?? Number.NaN);
    if (known && start < 0) start = i;
    if (known || start < 0) continue;
    d += closed(x, top, bottom, y, { from: start, to: i });
    start = -1;
  }
  return d;
}

function closed(
  x: ArrayLike<number>,
  top: ArrayLike<number>,
  bottom: ArrayLike<number>,
  y: Scale,
  { from, to }: { readonly from: number; readonly to: number },
): string {
  let d = "";
  for (let i = from; i < to; i++)
    d += `${i === from ? "M" : "L"}${px(x[i] ?? 0)} ${px(y(top[i] ?? 0))}`;
  for (let i = to - 1; i >= from; i--) d += `L${px(x[i] ?? 0)} ${px(y(bottom[i] ?? 0))}`;
  return `${d}Z`;
}

/** A stretch of columns, `from` included, `to` not. */
export interface Run {
  readonly from: number;
  readonly to: number;
}

/** Stretches over which `same` gives one and the same answer; undefined belongs to none. */
export function runs<T>(length: number, same: (i: number) => T | undefined): (Run & { is: T })[] {
  const out: (Run & { is: T })[] = [];
  let from = 0;
  for (let i = 1; i <= length; i++) {
    const is = same(from);
    if (i < length && same(i) === is) continue;
    if (is !== undefined) out.push({ from, to: i, is });
    from = i;
  }
  return out;
}

/** The same stretches without those shorter than `least`, which join the one before them. */
export function longRuns<T>(all: readonly (Run & { is: T })[], least: number): (Run & { is: T })[] {
  const out: (Run & { is: T })[] = [];
  for (const run of all) {
    const last = out[out.length - 1];
    if (
      last !== undefined &&
      last.to === run.from &&
      (run.to - run.from < least || last.is === run.is)
    ) {
      out[out.length - 1] = { ...last, to: run.to };
    } else out.push(run);
  }
  return out;
}
