import type { Bench } from "../model/bench.ts";
import { type Channel, channelNamed, type Manifest } from "../model/manifest.ts";
import { CHANNELS_MAX } from "../model/sample.ts";
import type { StreamSpec } from "../model/stream.ts";
import { rowOf } from "./hazards.ts";
import type { CompiledPlan, Plan, Scale } from "./plan.ts";
import { conversionOf, levelsOf, scaleOf, shareOf, timesOf } from "./plan-parts.ts";
import { WATCH } from "./records.ts";
import { type CaseTables, caseTables, outputTable } from "./tables.ts";

/**
 * The plan of a bench whose controller has firmware of its own. Channels may be missing: what they
 * would tell is then not known, and their rows say nothing.
 */

/** A cell that no stream fills; its value is never used, because its scale is not a number. */
const ABSENT = CHANNELS_MAX - 1;
/** Stands for "no limit of a board" in counts; the tables take one milliampere a count. */
const NO_LIMIT_counts = 1_000_000_000;

/** Rows that a stream cannot show: bits of a board, answers to permits, a photodiode's full scale. */
const BLIND = ["key", "loop", "curve-differs", "permit-age", "dark-time", "dark-light"] as const;

export function watchOf(stream: StreamSpec | undefined): number {
  if (stream === undefined) return WATCH.none;
  const { cutOff } = stream;
  if (cutOff === null) return WATCH.only;
  if (cutOff.kind === "text") return WATCH.text;
  return cutOff.mode === "static" ? WATCH.line : WATCH.toggled;
}

/** Compiles a watched bench. */
export function compileWatched(bench: Bench, manifest: Manifest): CompiledPlan {
  const problems: string[] = [];
  const scale = (name: string): Scale => {
    const channel = channelNamed(manifest, name);
    return channel === undefined ? ABSENT_SCALE : scaleOf(bench, channel, problems);
  };
  const current = scale("current");
  const photodiode = scale("photodiode");
  const set = channelNamed(manifest, "set") === undefined ? current : scale("set");
  const case_ = channelNamed(manifest, "case");
  if (problems.length > 0) return { ok: false, problems };
  const light = channelNamed(manifest, "photodiode");
  const plan: Plan = {
    builtIn: false,
    watch: watchOf(bench.controller.stream),
    set,
    current,
    photodiode,
    outputKnown: light !== undefined,
    caseChannel: case_?.index ?? ABSENT,
    case: case_ === undefined ? noCase(bench) : watchedCase(bench, case_),
    caseShare:
      case_ === undefined
        ? { perCount: Number.NaN, offset: Number.NaN }
        : shareOf(conversionOf(bench, case_)),
    output: outputTable(bench),
    absolute_counts: manifest.absolute_counts,
    ...timesOf(bench, manifest),
    slewUp_mAperS: bench.limits.slewUp_mAperS,
    recover_K: bench.limits.recover_K,
    recover_ms: bench.limits.recover_ms,
    ...levelsOf(bench),
  };
  for (const row of BLIND) silence(plan, rowOf(row));
  // Without a clock of its own, the board's time is this computer's.
  if (bench.controller.stream?.time === null) silence(plan, rowOf("tick-drift"));
  if (plan.watch === WATCH.only) onlyWarn(plan);
  return { ok: true, plan };
}

/** Where nothing cuts, a row without a warning warns at its limit, and a gap has no deadline. */
function onlyWarn(plan: Plan): void {
  for (const [row, trip] of plan.trip.entries()) {
    if (!Number.isNaN(plan.warn[row] as number) || Number.isNaN(trip)) continue;
    plan.warn[row] = trip;
    plan.warnDelay_ms[row] = plan.tripDelay_ms[row] as number;
  }
  plan.trip[rowOf("sample-gap")] = Number.NaN;
}

function silence(plan: Plan, row: number): void {
  plan.warn[row] = Number.NaN;
  plan.trip[row] = Number.NaN;
}

const ABSENT_SCALE: Scale = {
  channel: ABSENT,
  perCount: Number.NaN,
  offset: Number.NaN,
  count_min: Number.NEGATIVE_INFINITY,
  count_max: Number.POSITIVE_INFINITY,
  error: 0,
};

/** The corridor over the case's counts; no board holds a table, so none lowers it. */
function watchedCase(bench: Bench, channel: Channel): CaseTables {
  const { count_min, count_max } = channel;
  const curve = { x: [count_min, count_max], y: [NO_LIMIT_counts, NO_LIMIT_counts] };
  return caseTables(bench, conversionOf(bench, channel), { count_min, count_max }, curve, NO_BOARD);
}

const NO_BOARD = { perCount_mA: 1, offset_mA: 0, absolute_counts: NO_LIMIT_counts };

/** Without a case reading only the limits that need none are known, and no floor. */
function noCase(bench: Bench): CaseTables {
  const conversion = {
    version: 0,
    law: { kind: "linear" as const, perCount: 0, offset: bench.derating[0]?.case_degC ?? 0 },
    error: 0,
  };
  const range = { count_min: 0, count_max: 0 };
  const curve = { x: [-1, 1], y: [NO_LIMIT_counts, NO_LIMIT_counts] };
  const tables = caseTables(bench, conversion, range, curve, NO_BOARD);
  tables.case_degC.fill(Number.NaN);
  tables.floor_mA.fill(Number.NaN);
  return tables;
}
