import { BOUNDS } from "../bench-file/init/bounds.ts";
import { parseQuantity } from "../model/quantities.ts";
import type { QuantityKind } from "../model/quantity-units.ts";

/** One thing that `init` asks: an option of the command and a question at a terminal alike. */
export interface Question {
  /** Name of the option, `case-max`. */
  readonly key: string;
  readonly ask: string;
  /** A quantity of that kind within bounds, or a text of that form. */
  readonly form:
    | { readonly kind: QuantityKind; readonly min: number; readonly max: number }
    | { readonly pattern: RegExp; readonly wanted: string };
  /** What no answer means: a usual value, "" for not known, null where there must be an answer. */
  readonly usual: string | null;
}

const quantity = (
  key: string,
  ask: string,
  kind: QuantityKind,
  [min, max]: readonly [number, number],
  usual: string | null,
): Question => ({ key, ask, form: { kind, min, max }, usual });
const text = (
  key: string,
  ask: string,
  pattern: RegExp,
  wanted: string,
  usual: string | null,
): Question => ({ key, ask, form: { pattern, wanted }, usual });

/** In the order in which a person has the answers at hand: the board, then the data sheet. */
export const QUESTIONS: readonly Question[] = [
  text(
    "name",
    "short name of the bench",
    /^[a-z][a-z0-9-]{0,30}$/,
    "a-z, 0-9 and -, beginning with a letter",
    "my-bench",
  ),
  text("title", "one line on what it is", /^[^\r\n]{1,120}$/, "one line of text", "a bench laser"),
  text(
    "path",
    "serial port of the board, or host:port",
    /^\S{1,200}$/,
    "a path such as /dev/ttyUSB0, or 192.168.1.20:4160",
    "/dev/ttyUSB0",
  ),
  quantity("baud", "line rate of the port", "baud", BOUNDS.baud, "115200 baud"),
  text(
    "board",
    "serial number of the board",
    /^(any|[A-Z0-9-]{1,12})$/,
    "a serial number, or any",
    "any",
  ),
  quantity("rate", "samples a second that the board sends", "rate", BOUNDS.rate, "50 /s"),
  quantity("wavelength", "wavelength of the diode", "length", BOUNDS.length, null),
  quantity("threshold", "threshold current", "current", BOUNDS.current, null),
  quantity("slope", "slope efficiency", "slope", BOUNDS.slope, null),
  quantity(
    "at",
    "case temperature at which these hold",
    "temperature",
    BOUNDS.temperature,
    "25 °C",
  ),
  quantity("current", "operating current", "current", BOUNDS.current, null),
  quantity("voltage", "operating voltage", "voltage", BOUNDS.voltage, ""),
  quantity("absolute", "absolute maximum of the current", "current", BOUNDS.current, null),
  quantity("case-min", "lowest case temperature", "temperature", BOUNDS.temperature, "10 °C"),
  quantity("case-max", "highest case temperature", "temperature", BOUNDS.temperature, "45 °C"),
  quantity("drift", "drift of the wavelength", "drift", BOUNDS.drift, ""),
  quantity("thermistor", "case thermistor at 25 °C", "resistance", BOUNDS.resistance, ""),
  quantity("beta", "beta of that thermistor", "difference", BOUNDS.beta, "3950 K"),
  quantity("fixed", "resistor that makes its divider", "resistance", BOUNDS.resistance, "10 kohm"),
  quantity("full", "counts of the converter at full supply", "count", BOUNDS.count, "1024 counts"),
  quantity(
    "photodiode",
    "light that one count of the photodiode stands for",
    "power",
    BOUNDS.step,
    "",
  ),
  text(
    "has",
    "what the bench has of key, interlock-loop, emission-warning, beam-stop, manual-reset, toggled-enable",
    /^(none|[a-z-]+(\s*,\s*[a-z-]+)*)$/,
    "these words with commas between, or none",
    "none",
  ),
];

/** Why an answer cannot be taken, in words, or null where it can. Nothing is only taken if usual. */
export function refusal({ form, usual }: Question, answer: string): string | null {
  if (answer === "")
    return usual === null ? "This has no usual value; it is on the data sheet." : null;
  if ("pattern" in form) {
    return form.pattern.test(answer) ? null : `Found "${answer}"; wanted ${form.wanted}.`;
  }
  const parsed = parseQuantity(form.kind, answer);
  if (!parsed.ok) return `Found ${parsed.found}; wanted ${parsed.wanted}: ${parsed.do}.`;
  if (parsed.value >= form.min && parsed.value <= form.max) return null;
  return `${answer} is far from anything usual; look at the unit.`;
}
