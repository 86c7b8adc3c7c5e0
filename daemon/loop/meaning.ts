import { STATE } from "../judge/records.ts";
import { expectedOutput_mW } from "../judge/tables.ts";
import { readBack, refusalWords } from "../judge/words.ts";
import { formatQuantity } from "../model/quantities.ts";
import { linkWords } from "./link-words.ts";
import type { Loop } from "./loop.ts";
import type { LoopAnswer } from "./ports.ts";
import { namesOf } from "./snapshot.ts";

/**
 * What arming at a current would mean just now, in a sentence to read back before it is typed
 * again; or why it would be refused. Changes nothing: the judge decides anew when it is asked to arm.
 * @param current_mA the current meant
 * @param port what the port says; empty while lines come
 */
export function meaningOf(loop: Loop, current_mA: number, port: string): LoopAnswer {
  const { plan, bench } = loop;
  const { view } = loop.out;
  const refused = (reason: Parameters<typeof refusalWords>[0], value: number): LoopAnswer => ({
    ok: false,
    reason,
    words: refusalWords(reason, current_mA, value, view),
  });
  if (bench.controller.stream !== undefined) return refused("watch-only", Number.NaN);
  if (view.state === STATE.tripped) return refused("tripped", view.cause);
  if (view.state === STATE.offline || plan === null) {
    const why = linkWords(loop, port);
    return { ...refused("offline", Number.NaN), ...(why === "" ? {} : { words: why }) };
  }
  if (view.state !== STATE.standby) return refused("not-standby", Number.NaN);
  if (!(current_mA >= 0)) return refused("below-zero", Number.NaN);
  if (!(current_mA <= view.ceiling_mA)) {
    return { ...refused("above-ceiling", view.ceiling_mA), highest_mA: view.ceiling_mA };
  }
  const done = { ok: true, reason: "" };
  if (current_mA === 0) {
    return { ...done, words: `${bench.name} would be armed at zero current, without light.` };
  }
  const expected_mW = expectedOutput_mW(plan.output, current_mA, view.case_degC);
  const words = readBack(namesOf(bench), current_mA, expected_mW, view);
  if (!(current_mA < view.floor_mA)) return { ...done, words };
  const floor = formatQuantity("current", view.floor_mA, 10);
  return { ...done, words: `${words} That is under threshold, ${floor} just now.` };
}
