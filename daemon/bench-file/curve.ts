import type { Bench } from "../model/bench.ts";
import type { Law } from "../model/conversion.ts";
import { type Channel, channelNamed, type Manifest } from "../model/manifest.ts";
import { formatQuantity } from "../model/quantities.ts";
import { lawToUnit, sensorShare } from "../physics/convert.ts";
import { derated_mA, junctionLimited_mA } from "../physics/diode.ts";

/**
 * The board's own copy of the ceiling: a table from raw counts of its case channel to counts of its
 * set current. The board draws straight lines between points, rounds down, and takes zero outside
 * the first and last point, so the table is made such that this never passes the exact ceiling at
 * any count.
 */
export interface CurveTable {
  /** Case counts, ascending. */
  readonly x: readonly number[];
  /** Set counts allowed there. */
  readonly y: readonly number[];
  /** Most by which the table lies under the exact ceiling, set counts. */
  readonly loss_counts: number;
}

/** Most points a board takes, and the largest number that a point can hold. */
export const CURVE_POINTS_MAX = 32;
const POINT_MAX = 65_535;

/**
 * The table for this bench on this controller, or what stands in its way, in sentences.
 * About a millisecond for each thousand counts of the case channel.
 */
export function makeCurve(
  bench: Bench,
  manifest: Manifest,
): CurveTable | { readonly problems: readonly string[] } {
  // A controller with firmware of its own holds no curve, and nothing is loaded into it.
  if (bench.controller.stream !== undefined) return { x: [], y: [], loss_counts: 0 };
  const caseChannel = channelNamed(manifest, "case");
  const setChannel = channelNamed(manifest, "set");
  const problems = channelProblems(bench, caseChannel, setChannel);
  if (problems.length > 0 || caseChannel === undefined || setChannel === undefined) {
    return { problems };
  }
  const reach = reachProblem(bench, caseChannel);
  if (reach !== null) return { problems: [reach] };
  const exact = exactCeilings(bench, caseChannel, setChannel.perCount, manifest.absolute_counts);
  const from = Math.max(0, caseChannel.count_min);
  const first = exact.findIndex((counts) => counts > 0);
  if (first === -1) {
    return { problems: ["The bench file allows no current at any reading of the case channel."] };
  }
  let last = first;
  while (last + 1 < exact.length && (exact[last + 1] ?? 0) > 0) last += 1;
  if (last === first) {
    return { problems: ["The bench file allows current at one single count of the case channel."] };
  }
  const corners = refine(exact, first, last);
  const y = lower(exact, corners);
  return { x: corners.map((at) => at + from), y, loss_counts: worstLoss(exact, corners, y) };
}

/** Each point as x then y, little-endian 16 bits: the bytes over which the curve's CRC-32 runs. */
export function curveBytes(table: Pick<CurveTable, "x" | "y">): Uint8Array {
  const bytes = new Uint8Array(table.x.length * 4);
  const view = new DataView(bytes.buffer);
  for (const [n, x] of table.x.entries()) {
    view.setUint16(4 * n, x, true);
    view.setUint16(4 * n + 2, table.y[n] ?? 0, true);
  }
  return bytes;
}

/** What the board makes of the table at a case count: straight lines, rounded down, zero outside. */
export function tableCounts(table: Pick<CurveTable, "x" | "y">, count: number): number {
  const { x, y } = table;
  for (let n = 1; n < x.length; n += 1) {
    const right = x[n] ?? 0;
    const left = x[n - 1] ?? 0;
    if (count < left || count > right) continue;
    return lineAt(left, y[n - 1] ?? 0, right, y[n] ?? 0, count);
  }
  return 0;
}

/**
 * The ceiling that the board shall hold at a case reading, mA: least of derating, junction limit,
 * bench limit and the diode's absolute maximum, all at the upper edge of the reading's error.
 */
export function boardCeiling_mA(bench: Bench, reading_degC: number): number {
  const upper_degC = reading_degC + (bench.conversions.case?.error ?? 0);
  return Math.min(
    derated_mA(bench.derating, upper_degC),
    junctionLimited_mA(bench.diode, upper_degC),
    bench.limits.current_mA,
    bench.diode.absolute_mA,
  );
}

function channelProblems(
  bench: Bench,
  caseChannel: Channel | undefined,
  setChannel: Channel | undefined,
): string[] {
  const problems: string[] = [];
  if (caseChannel === undefined) {
    problems.push("The board has no channel named case, so its current cannot follow the case.");
  } else if (bench.conversions.case === undefined && caseChannel.unit !== "degC") {
    problems.push(
      `The board's case channel is in ${caseChannel.unit}, and the bench file does not say how to ` +
        "read it in °C. Add channels.case.",
    );
  } else if (caseChannel.count_max > POINT_MAX) {
    problems.push(`The board's case channel goes above ${POINT_MAX} counts, which no curve holds.`);
  }
  if (setChannel === undefined) problems.push("The board has no channel named set.");
  else if (setChannel.unit !== "mA" || !(setChannel.perCount > 0)) {
    problems.push(`The board's set channel is in ${setChannel.unit}; a curve needs mA, upward.`);
  }
  return problems;
}

const caseLaw = (bench: Bench, channel: Channel): Law =>
  bench.conversions.case?.law ?? { kind: "linear", perCount: channel.perCount, offset: 0 };

/** A case channel whose counts end below the trip level would never show a case too warm. */
function reachProblem(bench: Bench, channel: Channel): string | null {
  const { trip } = bench.hazards["case-over"];
  if (trip === null) return null;
  const law = caseLaw(bench, channel);
  const ends = [lawToUnit(law, channel.count_min), lawToUnit(law, channel.count_max)];
  const top_degC = Math.max(...ends);
  if (top_degC > trip) return null;
  const words = (degC: number): string => formatQuantity("temperature", degC);
  return (
    `The board's case channel reads at most ${words(top_degC)}, and hazards.case-over trips at ` +
    `${words(trip)}. Change the sensor's range on the board, or lower the trip.`
  );
}

/** The exact ceiling in whole set counts, rounded down, at every count from the lowest on. */
function exactCeilings(
  bench: Bench,
  channel: Channel,
  set_mAperCount: number,
  absolute_counts: number,
): Int32Array {
  const from = Math.max(0, channel.count_min);
  const exact = new Int32Array(Math.max(0, channel.count_max - from + 1));
  const law = caseLaw(bench, channel);
  const open = bench.hazards["case-open"].trip ?? 1;
  const short = bench.hazards["case-short"].trip ?? 0;
  const most = Math.min(absolute_counts, POINT_MAX);
  for (let n = 0; n < exact.length; n += 1) {
    const count = from + n;
    if (law.kind !== "linear") {
      const share = sensorShare(law.divider, count);
      if (share >= open || share <= short) continue;
    }
    const reading_degC = lawToUnit(law, count);
    if (!Number.isFinite(reading_degC)) continue;
    const counts = Math.floor(boardCeiling_mA(bench, reading_degC) / set_mAperCount);
    exact[n] = Math.max(0, Math.min(most, counts));
  }
  return exact;
}

/** Corners for straight lines near the exact ceiling: split where the worst line is worst. */
function refine(exact: Int32Array, first: number, last: number): number[] {
  const corners = [first, last];
  while (corners.length < CURVE_POINTS_MAX) {
    let worst = 1;
    let at = -1;
    for (let n = 1; n < corners.length; n += 1) {
      const left = corners[n - 1] ?? 0;
      const right = corners[n] ?? 0;
      for (let x = left + 1; x < right; x += 1) {
        const line = lineAt(left, exact[left] ?? 0, right, exact[right] ?? 0, x);
        const off = Math.abs(line - (exact[x] ?? 0));
        if (off > worst) {
          worst = off;
          at = x;
        }
      }
    }
    if (at === -1) break;
    corners.push(at);
    corners.sort((a, b) => a - b);
  }
  return corners;
}

/** Heights of the corners, taken down until no line passes the exact ceiling anywhere. */
function lower(exact: Int32Array, corners: readonly number[]): number[] {
  const y = corners.map((at) => exact[at] ?? 0);
  let lowered = true;
  while (lowered) {
    lowered = false;
    for (let n = 1; n < corners.length; n += 1) {
      const over = worstOver(exact, corners, y, n);
      if (over <= 0) continue;
      y[n - 1] = Math.max(0, (y[n - 1] ?? 0) - over);
      y[n] = Math.max(0, (y[n] ?? 0) - over);
      lowered = true;
    }
  }
  return y;
}

function worstOver(exact: Int32Array, corners: readonly number[], y: readonly number[], n: number) {
  const left = corners[n - 1] ?? 0;
  const right = corners[n] ?? 0;
  let over = 0;
  for (let x = left; x <= right; x += 1) {
    over = Math.max(over, lineAt(left, y[n - 1] ?? 0, right, y[n] ?? 0, x) - (exact[x] ?? 0));
  }
  return over;
}

function worstLoss(exact: Int32Array, corners: readonly number[], y: readonly number[]): number {
  let loss = 0;
  for (let x = corners[0] ?? 0; x <= (corners[corners.length - 1] ?? -1); x += 1) {
    loss = Math.max(loss, (exact[x] ?? 0) - tableCounts({ x: corners, y }, x));
  }
  return loss;
}

/** Height at x of the line between two points, rounded down. Exact: all numbers stay below 2^53. */
const lineAt = (x0: number, y0: number, x1: number, y1: number, x: number): number =>
  y0 + Math.floor(((y1 - y0) * (x - x0)) / (x1 - x0));
