import type { Snapshot } from "../../daemon/desk/api.ts";
import { amps, ampsAsMeant } from "../words/format.ts";

/** What a typed current comes to: nothing yet, a refusal in words, or a sentence to read back. */
export type Meant =
  | { readonly kind: "nothing" }
  | { readonly kind: "refused"; readonly words: string }
  | { readonly kind: "meant"; readonly current_mA: number; readonly words: string };

/** Longest text that can be a current. */
const TYPED_CHARS_MAX = 12;
/** A page asks for whole milliamperes; the board's steps are coarser. */
const STEP_mA = 1;

/** The typed current in mA. "1.75", "1,75", "1.75 A" and "1750 mA" are all the same. */
export function typedCurrent(text: string): number | undefined {
  const match = /^\s*(\d*[.,]?\d+)\s*(m?A)?\s*$/i.exec(text.slice(0, TYPED_CHARS_MAX + 1));
  if (match === null || text.length > TYPED_CHARS_MAX) return undefined;
  const value = Number((match[1] ?? "").replace(",", "."));
  const current_mA = match[2]?.toLowerCase() === "ma" ? value : value * 1000;
  return Math.round(current_mA / STEP_mA) * STEP_mA;
}

const floorTo10 = (current_mA: number): number => Math.floor(current_mA / 10) * 10;

/** Reads a typed current back as a sentence, or refuses it with the highest allowed just now. */
export function readBack(text: string, now: Snapshot): Meant {
  if (text.trim() === "") return { kind: "nothing" };
  const current_mA = typedCurrent(text);
  if (current_mA === undefined) {
    return { kind: "refused", words: `"${text}" is no current. Type it in amperes, such as 1.20.` };
  }
  if (current_mA === 0) {
    return { kind: "refused", words: "Zero is no current to arm for. Dark switches light off." };
  }
  const meant = ampsAsMeant(current_mA);
  if (now.ceiling_mA === null) {
    return { kind: "refused", words: "The ceiling is not known, so no current can be allowed." };
  }
  const highest = Math.min(now.ceiling_mA, now.limit_mA);
  if (current_mA > highest) {
    const allowed = ampsAsMeant(floorTo10(highest));
    return {
      kind: "refused",
      words: `${meant} is above the ceiling, ${amps(highest)} just now. Type ${allowed} or less.`,
    };
  }
  return { kind: "meant", current_mA, words: sentence(current_mA, highest, now) };
}

function sentence(current_mA: number, highest: number, now: Snapshot): string {
  const meant = ampsAsMeant(current_mA);
  const room = `${amps(highest - current_mA)} under the ceiling`;
  const low =
    now.floor_mA !== null && current_mA < now.floor_mA
      ? ` That is below threshold, ${amps(now.floor_mA)} just now: no laser light at ${now.wavelength_nm}\u00a0nm.`
      : "";
  const how =
    now.state === "standby"
      ? "The warning comes on first, and light starts some seconds after it."
      : "The current goes there at the bench's own rate.";
  return `I mean ${meant}, ${room}.${low} ${how} Everyone inside wears eyewear.`;
}
