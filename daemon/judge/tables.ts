import type { Bench } from "../model/bench.ts";
import { type Maker, makerCode } from "../model/ceiling.ts";
import type { Conversion } from "../model/conversion.ts";
import { lawToUnit } from "../physics/convert.ts";
import { crystalOutput_mW, floor_mA } from "../physics/crystal.ts";
import { derated_mA, junctionLimited_mA, power_mW } from "../physics/diode.ts";

/**
 * The corridor, worked out once for every count that the case channel can give, so that judging a
 * sample is a look into a table. All physics of the judge is in this file.
 */

/** Most entries of a table by case counts; a finer converter shares entries between counts. */
const ENTRIES_MAX = 65_536;

/** Grid of the slow functions: floor and expected output, by case temperature and current. */
const GRID_degC_MIN = -40;
const GRID_degC_MAX = 150;
const FLOOR_STEP_K = 0.1;
const OUTPUT_STEP_K = 0.5;
const OUTPUT_CURRENTS = 128;

/** The host stays this much below the table that the board holds, so that it acts first. */
export const BELOW_BOARD_SHARE = 0.01;
export const BELOW_BOARD_COUNTS = 2;

/** The board's table: raw case counts ascending, and the current allowed there in set counts. */
export interface Curve {
  readonly x: readonly number[];
  readonly y: readonly number[];
}

/** How counts of the set channel stand for current: mA = counts × perCount + offset. */
export interface SetScale {
  readonly perCount_mA: number;
  readonly offset_mA: number;
  readonly absolute_counts: number;
}

/** What the tables say of each count of the case channel, from `count_min` on. */
export interface CaseTables {
  readonly count_min: number;
  readonly count_max: number;
  /** Counts are shifted right by this many bits to find their entry. */
  readonly shift: number;
  readonly case_degC: Float64Array;
  readonly ceiling_mA: Float64Array;
  /** The ceiling in counts of set, rounded down and under the board's own: the cap of a permit. */
  readonly cap_counts: Int32Array;
  readonly maker: Uint8Array;
  readonly floor_mA: Float64Array;
  /** 1 where the next entry is warmer, −1 where it is cooler. */
  readonly warmer: number;
}

/** Output that a healthy bench gives, mW, over case temperature (rows) and current (columns). */
export interface OutputTable {
  readonly current_mA_step: number;
  readonly columns: number;
  readonly rows: number;
  readonly mW: Float64Array;
}

/** A count this close under the next one is that one: 1800 mA over 0.1 mA is 18000 counts. */
export const COUNT_DUST = 1e-6;

/** Counts of set for a current, rounded down; zero for what lies under the first count. */
export function toSetCounts(set: SetScale, current_mA: number): number {
  const counts = Math.floor((current_mA - set.offset_mA) / set.perCount_mA + COUNT_DUST);
  return Math.max(0, counts);
}

/** Current that the board's table allows at a case count, set counts rounded down; zero outside. */
export function boardAllows_counts(curve: Curve, count: number): number {
  const { x, y } = curve;
  for (let i = 1; i < x.length; i++) {
    const x0 = x[i - 1] as number;
    const x1 = x[i] as number;
    if (count < x0 || count > x1) continue;
    const y0 = y[i - 1] as number;
    const y1 = y[i] as number;
    return Math.floor(y0 + ((count - x0) * (y1 - y0)) / (x1 - x0));
  }
  return 0;
}

/** Where the host stops, so that it acts before the board does: set counts, rounded down. */
export function hostAllows_counts(board_counts: number): number {
  const below = Math.max(BELOW_BOARD_COUNTS, board_counts * BELOW_BOARD_SHARE);
  return Math.max(0, Math.floor(board_counts - below));
}

/** A ceiling and which limit makes it. */
interface Ceiling {
  readonly current_mA: number;
  readonly maker: number;
}

/**
 * The least of all limits that hold at one case count, and its name. The board's table is made from
 * the same limits, so staying below it lowers the ceiling without giving it another maker.
 */
function ceilingAt(
  bench: Bench,
  conversion: Conversion,
  curve: Curve,
  set: SetScale,
  count: number,
): Ceiling {
  const upper_degC = lawToUnit(conversion.law, count) + conversion.error;
  if (!Number.isFinite(upper_degC)) return { current_mA: 0, maker: makerCode("derating") };
  const toBoard_mA = (counts: number): number =>
    counts > 0 ? Math.max(0, counts * set.perCount_mA + set.offset_mA) : 0;
  const limits = [
    [derated_mA(bench.derating, upper_degC), "derating"],
    [junctionLimited_mA(bench.diode, upper_degC), "junction"],
    [Math.min(bench.limits.current_mA, bench.diode.absolute_mA), "bench"],
    [toBoard_mA(set.absolute_counts), "board"],
  ] as const;
  let [least_mA, maker]: readonly [number, Maker] = limits[0];
  for (const [current_mA, name] of limits) {
    if (current_mA < least_mA) [least_mA, maker] = [current_mA, name];
  }
  const below_mA = toBoard_mA(hostAllows_counts(boardAllows_counts(curve, count)));
  return { current_mA: Math.min(least_mA, below_mA), maker: makerCode(maker) };
}

/**
 * Works out corridor and temperature for every count between `count_min` and `count_max`. Where
 * several counts share an entry, the entry holds the lower ceiling of its two ends.
 */
export function caseTables(
  bench: Bench,
  conversion: Conversion,
  range: { readonly count_min: number; readonly count_max: number },
  curve: Curve,
  set: SetScale,
): CaseTables {
  const span = range.count_max - range.count_min + 1;
  const shift = Math.max(0, Math.ceil(Math.log2(span / ENTRIES_MAX)));
  const entries = Math.floor((span - 1) / 2 ** shift) + 1;
  const tables: CaseTables = {
    ...range,
    shift,
    case_degC: new Float64Array(entries),
    ceiling_mA: new Float64Array(entries),
    cap_counts: new Int32Array(entries),
    maker: new Uint8Array(entries),
    floor_mA: new Float64Array(entries),
    warmer: 1,
  };
  const floors = floorGrid(bench);
  for (let i = 0; i < entries; i++) {
    const low = range.count_min + i * 2 ** shift;
    const high = Math.min(range.count_max, low + 2 ** shift - 1);
    const one = ceilingAt(bench, conversion, curve, set, low);
    const other = high === low ? one : ceilingAt(bench, conversion, curve, set, high);
    const least = other.current_mA < one.current_mA ? other : one;
    const case_degC = lawToUnit(conversion.law, (low + high) / 2);
    tables.case_degC[i] = case_degC;
    tables.ceiling_mA[i] = least.current_mA;
    tables.cap_counts[i] = Math.min(toSetCounts(set, least.current_mA), set.absolute_counts);
    tables.maker[i] = least.maker;
    tables.floor_mA[i] = fromFloorGrid(floors, case_degC);
  }
  const middle = Math.floor(entries / 2);
  const rises = (tables.case_degC[middle + 1] ?? 0) > (tables.case_degC[middle] ?? 0);
  return { ...tables, warmer: rises ? 1 : -1 };
}

function floorGrid(bench: Bench): Float64Array {
  const grid = new Float64Array(Math.round((GRID_degC_MAX - GRID_degC_MIN) / FLOOR_STEP_K) + 1);
  for (let i = 0; i < grid.length; i++) {
    const case_degC = GRID_degC_MIN + i * FLOOR_STEP_K;
    grid[i] = floor_mA(bench.diode, bench.crystal, case_degC, bench.diode.absolute_mA);
  }
  return grid;
}

/** Straight between grid points; NaN outside the grid, Infinity where a neighbour is. */
function fromFloorGrid(grid: Float64Array, case_degC: number): number {
  const place = (case_degC - GRID_degC_MIN) / FLOOR_STEP_K;
  const i = Math.floor(place);
  if (!(i >= 0 && i < grid.length - 1)) return Number.NaN;
  const below = grid[i] as number;
  const above = grid[i + 1] as number;
  if (!Number.isFinite(below) || !Number.isFinite(above)) return Number.POSITIVE_INFINITY;
  return below + (above - below) * (place - i);
}

/** Works out what a healthy bench gives at every half kelvin and 128 currents up to its limit. */
export function outputTable(bench: Bench): OutputTable {
  const rows = (GRID_degC_MAX - GRID_degC_MIN) / OUTPUT_STEP_K + 1;
  const columns = OUTPUT_CURRENTS + 1;
  const current_mA_step = bench.limits.current_mA / OUTPUT_CURRENTS;
  const mW = new Float64Array(rows * columns);
  const { diode, crystal } = bench;
  for (let r = 0; r < rows; r++) {
    const case_degC = GRID_degC_MIN + r * OUTPUT_STEP_K;
    for (let c = 0; c < columns; c++) {
      const current_mA = c * current_mA_step;
      mW[r * columns + c] =
        crystal === null
          ? power_mW(diode, current_mA, case_degC)
          : crystalOutput_mW(diode, crystal, current_mA, case_degC);
    }
  }
  return { current_mA_step, columns, rows, mW };
}

/** Output expected at a current and case, mW, straight between grid points; NaN outside the grid. */
export function expectedOutput_mW(
  table: OutputTable,
  current_mA: number,
  case_degC: number,
): number {
  const across = Math.max(0, current_mA) / table.current_mA_step;
  const down = (case_degC - GRID_degC_MIN) / OUTPUT_STEP_K;
  // Above the limit the last two columns are drawn on: measured current may pass it by its error.
  const c = Math.min(Math.floor(across), table.columns - 2);
  const r = Math.floor(down);
  if (!(r >= 0 && r < table.rows - 1 && c >= 0)) return Number.NaN;
  const at = r * table.columns + c;
  const mW = table.mW;
  const u = across - c;
  const v = down - r;
  const upper = (mW[at] as number) * (1 - u) + (mW[at + 1] as number) * u;
  const next = at + table.columns;
  const lower = (mW[next] as number) * (1 - u) + (mW[next + 1] as number) * u;
  return upper * (1 - v) + lower * v;
}
