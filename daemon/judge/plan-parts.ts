import { type Bench, HAZARD_IDS } from "../model/bench.ts";
import type { Conversion, Divider } from "../model/conversion.ts";
import type { Channel, Manifest } from "../model/manifest.ts";
import type { Scale, Share } from "./plan.ts";
import { ROWS } from "./state.ts";

/** Parts that the plan of a permitted bench and that of a watched one have in common. */

/** Least controller time between two permits, ms. */
export const PERMIT_SPACING_ms = 50;

export const countRange = ({ count_min, count_max }: Channel) => ({ count_min, count_max });

/** The bench file's conversion of a channel, or the manifest's own scale. */
export function conversionOf(bench: Bench, channel: Channel): Conversion {
  const own = bench.conversions[channel.name];
  if (own !== undefined) return own;
  return { version: 0, law: { kind: "linear", perCount: channel.perCount, offset: 0 }, error: 0 };
}

export function scaleOf(bench: Bench, channel: Channel, problems: string[]): Scale {
  const { law, error } = conversionOf(bench, channel);
  if (law.kind !== "linear") {
    problems.push(
      `Channel "${channel.name}" is given as a ${law.kind} sensor; the judge needs it linear.`,
    );
    return { channel: channel.index, perCount: 1, offset: 0, ...countRange(channel), error };
  }
  const { perCount, offset } = law;
  if (!(perCount > 0)) {
    problems.push(`Channel "${channel.name}" has ${perCount} a count; it must be above zero.`);
  }
  return { channel: channel.index, perCount, offset, ...countRange(channel), error };
}

export function shareOf(conversion: Conversion): Share {
  const { law } = conversion;
  if (law.kind === "linear") return { perCount: Number.NaN, offset: Number.NaN };
  const { full_counts, sensor }: Divider = law.divider;
  return sensor === "to-ground"
    ? { perCount: 1 / full_counts, offset: 0 }
    : { perCount: -1 / full_counts, offset: 1 };
}

export function timesOf(bench: Bench, manifest: Manifest) {
  const period_ms = 1000 / manifest.rate_perS;
  return {
    tick_ms: manifest.tick_us / 1000,
    period_ms,
    fall_ms: manifest.fall_ms,
    window_ms: manifest.fall_ms + PERMIT_SPACING_ms + 2 * period_ms,
    term_ms: bench.controller.term_ms,
    term_ticks: termTicks(bench, manifest),
  };
}

export const termTicks = (bench: Bench, manifest: Manifest): number =>
  Math.floor((bench.controller.term_ms * 1000) / manifest.tick_us);

export function levelsOf(bench: Bench) {
  const levels = {
    warn: new Float64Array(ROWS),
    warnDelay_ms: new Float64Array(ROWS),
    trip: new Float64Array(ROWS),
    tripDelay_ms: new Float64Array(ROWS),
    deadband: new Float64Array(ROWS),
  };
  for (const [i, id] of HAZARD_IDS.entries()) {
    const row = bench.hazards[id];
    levels.warn[i] = row.warn ?? Number.NaN;
    levels.warnDelay_ms[i] = row.warnDelay_ms;
    levels.trip[i] = row.trip ?? Number.NaN;
    levels.tripDelay_ms[i] = row.tripDelay_ms;
    levels.deadband[i] = row.deadband;
  }
  return levels;
}
