import { causeOf } from "../model/cause.ts";
import { formatQuantity } from "../model/quantities.ts";
import { FLAG, STATE, type View } from "./records.ts";

/** What a watched bench does, in sentences: what is seen, and that nothing here holds it. */

const amps = (current_mA: number): string => formatQuantity("current", current_mA, 10);
const degrees = (case_degC: number): string => formatQuantity("temperature", case_degC, 0.1);
const milliwatts = (power_mW: number): string => formatQuantity("power", power_mW);

/** Whether a view is of a bench that takes no permits. */
export const isWatched = (view: View): boolean =>
  (view.flags & (FLAG.watchOnly | FLAG.cutOff)) !== 0;

/** What flows, how warm the case is and what leaves, of what the stream tells. */
function seen(view: View): string {
  const parts: string[] = [];
  if (Number.isFinite(view.case_degC)) parts.push(`the case is at ${degrees(view.case_degC)}`);
  if (Number.isFinite(view.output_mW)) parts.push(`${milliwatts(view.output_mW)} leave`);
  return parts.length === 0 ? "" : `, ${parts.join(", ")}`;
}

/** The state of a watched bench that is heard, in one sentence. */
export function watchedSentence(bench: string, view: View): string {
  if (view.state === STATE.tripped) return cutSentence(bench, view);
  const held =
    (view.flags & FLAG.watchOnly) !== 0 ? "watched, not enforced" : "watched, with a cut-off";
  if (!Number.isFinite(view.current_mA)) {
    return `${bench} is ${held}: its stream tells no current, so whether it emits is not known here${seen(view)}.`;
  }
  const flows =
    view.state === STATE.emitting ? `${amps(view.current_mA)} flows` : "no current flows";
  return `${bench} is ${held}: ${flows}${seen(view)}.`;
}

function cutSentence(bench: string, view: View): string {
  const why = `${bench} was cut because ${causeOf(view.cause).words}`;
  if (!Number.isFinite(view.current_mA)) return `${why}; its stream tells no current.`;
  return `${why}; ${amps(view.current_mA)} flows${seen(view)}.`;
}

/** What comes next on a watched bench, or what to do. */
export function watchedNext(view: View): string {
  if (view.state === STATE.tripped) {
    return `The cut-off holds until a person resets it, naming "${causeOf(view.cause).id}".`;
  }
  const room = Number.isFinite(view.ceiling_mA)
    ? ` Its ceiling would be ${amps(Math.floor(view.ceiling_mA / 10) * 10)} now.`
    : "";
  if ((view.flags & FLAG.watchOnly) !== 0) {
    return `It watches and warns but cannot enforce: only the bench itself can cut the light.${room}`;
  }
  return `A trip, or dark from here, cuts it.${room}`;
}
