import { isLit, trip } from "./cut.ts";
import { endArming, endResetting } from "./facts.ts";
import { eventHazardOf, rowOf } from "./hazards.ts";
import type { Plan } from "./plan.ts";
import type { Out } from "./records.ts";
import type { State } from "./state.ts";
import { EVENT, REFUSED, tell } from "./tell.ts";

/** What time alone can bring, without a sample: a gap in the samples, an answer that stays out. */

const GAP = rowOf("sample-gap");
const SAMPLE_GAP = 71;

/** Acts on every time limit that has passed. */
export function watchDeadlines(plan: Plan | null, state: State, out: Out): void {
  if (state.now_mono_ms >= state.armingUntil_mono_ms) {
    endArming(state, out, REFUSED["no-answer"], Number.NaN);
  }
  if (state.now_mono_ms >= state.resettingUntil_mono_ms) {
    endResetting(state, out, REFUSED["no-answer"], Number.NaN);
  }
  if (plan !== null) watchGap(plan, state, out);
}

/** Since when samples are waited for: the last one, or the arming where none came since. */
const waitedSince_ms = (state: State): number =>
  isLit(state) ? Math.max(state.sampled_mono_ms, state.armed_mono_ms) : state.sampled_mono_ms;

function watchGap(plan: Plan, state: State, out: Out): void {
  if (state.connected === 0 || state.sampled === 0) return;
  const gap_ms = state.now_mono_ms - waitedSince_ms(state);
  if (isLit(state) && gap_ms >= (plan.trip[GAP] as number)) {
    trip(state, out, SAMPLE_GAP, gap_ms, plan.trip[GAP] as number);
  }
  if (state.gapWarned === 0 && gap_ms >= (plan.warn[GAP] as number)) {
    state.gapWarned = 1;
    tell(out, EVENT.warning, eventHazardOf(GAP), gap_ms, plan.warn[GAP] as number);
  }
}

/** A sample came: the gap before it, if it was told, is over. */
export function endGap(plan: Plan, state: State, out: Out, gap_ms: number): void {
  if (state.gapWarned === 0) return;
  state.gapWarned = 0;
  tell(out, EVENT["warning-over"], eventHazardOf(GAP), gap_ms, plan.warn[GAP] as number);
}

/** When the next of these limits passes, monotonic ms; Infinity where none runs. */
export function nextDeadline(plan: Plan | null, state: State): number {
  let next = Math.min(state.armingUntil_mono_ms, state.resettingUntil_mono_ms);
  if (plan === null || state.connected === 0 || state.sampled === 0) return next;
  const since = waitedSince_ms(state);
  const warn_ms = plan.warn[GAP] as number;
  if (state.gapWarned === 0 && !Number.isNaN(warn_ms)) next = Math.min(next, since + warn_ms);
  const trip_ms = plan.trip[GAP] as number;
  if (isLit(state) && !Number.isNaN(trip_ms)) next = Math.min(next, since + trip_ms);
  return next;
}
