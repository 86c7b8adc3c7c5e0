import { formatQuantity, parseQuantity, type QuantityKind } from "../model/quantities.ts";
import { EXIT, Trouble } from "./say.ts";

/** Values as people write them on the command line. Each is refused in words, and nothing is done. */

const refuse = (found: string, wanted: string, advice: string): Trouble => {
  const remedy = `${advice.charAt(0).toUpperCase()}${advice.slice(1)}. Nothing was changed.`;
  return new Trouble(`Found ${found}; wanted ${wanted}.`, remedy, EXIT.usage);
};

function quantityOf(kind: QuantityKind, text: string): number {
  const parsed = parseQuantity(kind, text);
  if (parsed.ok) return parsed.value;
  throw refuse(parsed.found, parsed.wanted, parsed.do);
}

/** A current, mA. The words are joined, so that `arm 1.2 A` means what it says. */
export const currentOf = (words: readonly string[]): number =>
  quantityOf("current", words.join(" "));

/** A length of time (`8h`, `10 min`), ms, above zero and at most `ms_max`. */
export function durationOf(text: string, ms_max: number): number {
  const value_ms = quantityOf("time", text);
  if (value_ms > 0 && value_ms <= ms_max) return value_ms;
  const most = formatQuantity("time", ms_max, 1000);
  throw refuse(text, `a time above zero and at most ${most}`, "write for instance 8 h");
}

/** A whole number in plain digits, within bounds (both included). */
export function wholeOf(option: string, text: string, min: number, max: number): number {
  const value = /^\d{1,15}$/.test(text) ? Number(text) : Number.NaN;
  if (value >= min && value <= max) return value;
  const wanted = `a whole number from ${min} to ${max}`;
  throw refuse(`${option} "${text}"`, wanted, `write ${option} with such a number`);
}
