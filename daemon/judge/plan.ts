import type { Bench } from "../model/bench.ts";
import { type Channel, channelNamed, type Manifest } from "../model/manifest.ts";
import { formatQuantity } from "../model/quantities.ts";
import {
  conversionOf,
  countRange,
  levelsOf,
  PERMIT_SPACING_ms,
  scaleOf,
  shareOf,
  termTicks,
  timesOf,
} from "./plan-parts.ts";
import { WATCH } from "./records.ts";
import { WINDOW } from "./state.ts";
import {
  type CaseTables,
  type Curve,
  caseTables,
  type OutputTable,
  outputTable,
} from "./tables.ts";
import { compileWatched } from "./watch-plan.ts";

/**
 * The plan: a bench file and what a controller said of itself, compiled into flat numbers and
 * typed arrays. A step reads nothing else.
 */

/** A channel whose unit is a straight line of its counts. */
export interface Scale {
  readonly channel: number;
  readonly perCount: number;
  readonly offset: number;
  readonly count_min: number;
  readonly count_max: number;
  /** Half width of the reading's stated error, in the channel's unit. */
  readonly error: number;
}

/** Sensor's share of its divider = counts × perCount + offset; NaN where there is no divider. */
export interface Share {
  readonly perCount: number;
  readonly offset: number;
}

export interface Plan {
  readonly builtIn: boolean;
  /** WATCH of records.ts: none for a board that takes permits. */
  readonly watch: number;
  readonly set: Scale;
  readonly current: Scale;
  readonly photodiode: Scale;
  /** Whether the photodiode's unit is power; else output rows are blind. */
  readonly outputKnown: boolean;
  readonly caseChannel: number;
  readonly case: CaseTables;
  readonly caseShare: Share;
  readonly output: OutputTable;
  readonly absolute_counts: number;
  readonly tick_ms: number;
  readonly period_ms: number;
  readonly fall_ms: number;
  /** Window of "the highest of the last fall time": permits are spaced, readings are averages. */
  readonly window_ms: number;
  readonly term_ms: number;
  readonly term_ticks: number;
  readonly slewUp_mAperS: number;
  readonly recover_K: number;
  readonly recover_ms: number;
  /** By row of the hazard table; NaN where the row has no such action. */
  readonly warn: Float64Array;
  readonly warnDelay_ms: Float64Array;
  readonly trip: Float64Array;
  readonly tripDelay_ms: Float64Array;
  readonly deadband: Float64Array;
}

export type CompiledPlan =
  | { readonly ok: true; readonly plan: Plan }
  | { readonly ok: false; readonly problems: string[] };

/** A term holds at least this many sample periods, so that lost samples do not end light. */
export const PERIODS_PER_TERM_MIN = 5;

const JUDGED = ["set", "current", "case", "photodiode"] as const;

/**
 * Compiles a bench file for the controller that introduced itself.
 * @param curve the table that the board holds (or is about to): counts of case → counts of set
 * @returns the plan, or every reason why this bench cannot be run on this controller, in words
 */
export function compilePlan(bench: Bench, manifest: Manifest, curve: Curve): CompiledPlan {
  if (bench.controller.stream !== undefined) return compileWatched(bench, manifest);
  const problems: string[] = [];
  const channels = JUDGED.map((name) => channelNamed(manifest, name));
  const [set, current, case_, photodiode] = channels;
  for (const [i, channel] of channels.entries()) {
    if (channel === undefined) {
      problems.push(`The controller has no channel "${JUDGED[i]}", which the judge needs.`);
    } else if (channel.group !== 0) {
      problems.push(
        `Channel "${channel.name}" is in group ${channel.group}; the judge needs it in group 0, in every sample.`,
      );
    }
  }
  problems.push(...timeProblems(bench, manifest), ...curveProblems(curve, manifest));
  if (!set || !current || !case_ || !photodiode) return { ok: false, problems };

  const setScale = scaleOf(bench, set, problems);
  const currentScale = scaleOf(bench, current, problems);
  const photodiodeScale = scaleOf(bench, photodiode, problems);
  problems.push(...setProblems(bench, manifest, set, setScale));
  if (problems.length > 0) return { ok: false, problems };

  const conversion = conversionOf(bench, case_);
  const absolute_counts = manifest.absolute_counts;
  const scale = { perCount_mA: setScale.perCount, offset_mA: setScale.offset, absolute_counts };
  return {
    ok: true,
    plan: {
      builtIn: bench.controller.transport.kind === "built-in",
      watch: WATCH.none,
      set: setScale,
      current: currentScale,
      photodiode: photodiodeScale,
      outputKnown: bench.conversions.photodiode !== undefined || photodiode.unit === "mW",
      caseChannel: case_.index,
      case: caseTables(bench, conversion, countRange(case_), curve, scale),
      caseShare: shareOf(conversion),
      output: outputTable(bench),
      absolute_counts,
      ...timesOf(bench, manifest),
      slewUp_mAperS: bench.limits.slewUp_mAperS,
      recover_K: bench.limits.recover_K,
      recover_ms: bench.limits.recover_ms,
      ...levelsOf(bench),
    },
  };
}

const ms = (value: number): string => formatQuantity("time", value);

function timeProblems(bench: Bench, manifest: Manifest): string[] {
  const problems: string[] = [];
  const { rate_perS, term_ms } = bench.controller;
  if (manifest.rate_perS < rate_perS) {
    problems.push(
      `The bench file wants ${rate_perS} samples a second; the controller sends ${manifest.rate_perS}.`,
    );
  }
  const term_ticks = termTicks(bench, manifest);
  const { term_ticks_min, term_ticks_max, tick_us } = manifest;
  if (term_ticks < term_ticks_min || term_ticks > term_ticks_max) {
    const least = ms((term_ticks_min * tick_us) / 1000);
    const most = ms((term_ticks_max * tick_us) / 1000);
    problems.push(
      `The term is ${ms(term_ms)}; the controller takes ${least} to ${most}. Change controller.term.`,
    );
  }
  const term_ms_min = Math.max(
    (PERIODS_PER_TERM_MIN * 1000) / manifest.rate_perS,
    2 * PERMIT_SPACING_ms,
  );
  if (term_ms < term_ms_min) {
    problems.push(
      `The term is ${ms(term_ms)}, shorter than five sample periods (${ms(term_ms_min)}).`,
    );
  }
  const { window_ms, period_ms } = timesOf(bench, manifest);
  if (window_ms / period_ms > WINDOW - 1) {
    problems.push(
      `The stage's fall time of ${ms(manifest.fall_ms)} holds more than ${WINDOW} samples at ${manifest.rate_perS} a second.`,
    );
  }
  return problems;
}

function curveProblems(curve: Curve, manifest: Manifest): string[] {
  const { x, y } = curve;
  const problems: string[] = [];
  if (x.length < 2 || x.length !== y.length) {
    problems.push(
      `The board's table has ${x.length} points for ${y.length} currents; it needs two or more.`,
    );
  }
  if (x.some((value, i) => i > 0 && value <= (x[i - 1] as number))) {
    problems.push("The board's table does not ascend in case counts.");
  }
  if (y.some((value) => value > manifest.absolute_counts || value < 0)) {
    problems.push("The board's table passes the board's own absolute ceiling.");
  }
  return problems;
}

/** A host's calibration may only lower the current that is commanded, never raise it. */
function setProblems(bench: Bench, manifest: Manifest, channel: Channel, scale: Scale): string[] {
  const problems: string[] = [];
  const board_mA = manifest.absolute_counts * channel.perCount;
  const own_mA = manifest.absolute_counts * scale.perCount + scale.offset;
  if (scale.offset < 0 || own_mA < board_mA * (1 - 1e-9)) {
    problems.push(
      `The calibration of "set" reads ${formatQuantity("current", own_mA)} where the board reckons ${formatQuantity("current", board_mA)}, so more current would be commanded than the board believes.`,
    );
  }
  if (bench.limits.current_mA > bench.diode.absolute_mA) {
    problems.push(
      `The bench's limit of ${formatQuantity("current", bench.limits.current_mA)} passes the diode's absolute maximum of ${formatQuantity("current", bench.diode.absolute_mA)}.`,
    );
  }
  if (channel.unit !== "mA") {
    problems.push(`Channel "set" is in ${channel.unit}; the judge needs it in mA.`);
  }
  return problems;
}
