import { makerCode } from "../model/ceiling.ts";
import type { Plan } from "./plan.ts";
import type { Out } from "./records.ts";
import { type State, WINDOW } from "./state.ts";
import { expectedOutput_mW } from "./tables.ts";

/**
 * Where the current may be: the ceiling at this case (with the name of the limit that makes it), the
 * floor, and the highest ceiling and drive of the last fall time.
 */

const DERATING = makerCode("derating");

/** Looks the corridor up at the sample's case count. A count outside its range allows nothing. */
export function takeCorridor(plan: Plan, state: State): void {
  const tables = plan.case;
  const inside = state.case_counts >= tables.count_min && state.case_counts <= tables.count_max;
  const entry = (state.case_counts - tables.count_min) >> tables.shift;
  if (inside) {
    state.case_degC = tables.case_degC[entry] as number;
    state.ceiling_mA = tables.ceiling_mA[entry] as number;
    state.cap_counts = tables.cap_counts[entry] as number;
    state.maker = tables.maker[entry] as number;
    state.floor_mA = tables.floor_mA[entry] as number;
    state.expected_mW = expectedOutput_mW(plan.output, state.current_mA, state.case_degC);
  } else {
    state.case_degC = Number.NaN;
    state.ceiling_mA = 0;
    state.cap_counts = 0;
    state.maker = DERATING;
    state.floor_mA = Number.NaN;
    state.expected_mW = Number.NaN;
  }
}

/** Keeps ceiling and drive of this sample, and finds their extremes over the window. */
export function takeWindow(plan: Plan, state: State): void {
  const slot = state.windowCount % WINDOW;
  state.windowTime[slot] = state.board_ms;
  state.windowCeiling[slot] = state.ceiling_mA;
  state.windowSet[slot] = state.set_mA;
  state.windowCount++;
  const kept = Math.min(state.windowCount, WINDOW);
  const from_ms = state.board_ms - plan.window_ms;
  let ceilingHighest = state.ceiling_mA;
  let setHighest = state.set_mA;
  let setLowest = state.set_mA;
  for (let back = 1; back < kept; back++) {
    const i = (state.windowCount - 1 - back) % WINDOW;
    if ((state.windowTime[i] as number) < from_ms) break;
    const ceiling = state.windowCeiling[i] as number;
    const set = state.windowSet[i] as number;
    if (ceiling > ceilingHighest) ceilingHighest = ceiling;
    if (set > setHighest) setHighest = set;
    if (set < setLowest) setLowest = set;
  }
  state.ceilingHighest_mA = ceilingHighest;
  state.setHighest_mA = setHighest;
  state.setLowest_mA = setLowest;
}

/** Shows the corridor round what is asked while a session is open, and round what flows else. */
export function showCorridor(state: State, out: Out): void {
  const { view } = out;
  view.ceiling_mA = state.ceiling_mA;
  view.maker = state.maker;
  view.floor_mA = Number.isFinite(state.floor_mA) ? state.floor_mA : Number.NaN;
  view.margin_mA = state.current_mA - view.floor_mA;
  view.headroom_mA = state.ceiling_mA - state.current_mA;
  view.expected_mW = state.expected_mW;
}
