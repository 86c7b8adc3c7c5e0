import { parseQuantity } from "../model/quantities.ts";
import { EXIT, Trouble } from "./say.ts";

/** A current from the command line, mA; a number without its unit is refused in words. */
export function currentOf(text: string): number {
  const parsed = parseQuantity("current", text);
  if (parsed.ok) return parsed.value;
  throw new Trouble(
    `Found ${parsed.found}; wanted ${parsed.wanted}.`,
    `${parsed.do.charAt(0).toUpperCase()}${parsed.do.slice(1)}.`,
    EXIT.usage,
  );
}

/** A length of time from the command line (`8h`, `10 min`), ms. */
export function durationOf(text: string): number {
  const parsed = parseQuantity("time", text);
  if (parsed.ok && parsed.value > 0) return parsed.value;
  throw new Trouble(
    parsed.ok
      ? `Found ${text}; wanted more than nothing.`
      : `Found ${parsed.found}; wanted ${parsed.wanted}.`,
    parsed.ok
      ? "Write for instance 8 h."
      : `${parsed.do.charAt(0).toUpperCase()}${parsed.do.slice(1)}.`,
    EXIT.usage,
  );
}
