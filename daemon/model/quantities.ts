import { KINDS, MISSPELT, QUANTITY_KINDS, type QuantityKind, type Unit } from "./quantity-units.ts";

/**
 * Quantities as people write and read them. Everything that comes in with a unit comes through
 * `parseQuantity`, everything that goes out to people through `formatQuantity`; inside, a value is
 * a plain number whose name says its unit.
 */
export type { QuantityKind } from "./quantity-units.ts";

export type ParsedQuantity =
  | { readonly ok: true; readonly value: number }
  | { readonly ok: false; readonly found: string; readonly wanted: string; readonly do: string };

/** Longest text that can be a quantity; longer input is quoted only up to here. */
export const QUANTITY_CHARS_MAX = 40;

const NUMBER = /^([+-]?)(\d+(?:\.\d+)?|\.\d+)(?:[eE]([+-]?\d{1,3}))?/;
const DECIMAL_COMMA = /^[+-]?\d+,\d+/;
const MINUS = "\u2212";
const NARROW_SPACES = /[\u00a0\u2009\u202f]/g;

/**
 * The value of a written quantity, in the unit that the program holds for its kind (`1.8 A` as a
 * current is 1800). A number without its unit is refused, and so is a unit of another kind; the
 * refusal says what was found, what is wanted and what to write. Never throws.
 */
export function parseQuantity(kind: QuantityKind, text: string): ParsedQuantity {
  const spec = KINDS[kind];
  const wanted = `${spec.name} with its unit, such as ${spec.example}`;
  const found = quote(text);
  const refuse = (advice: string): ParsedQuantity => ({ ok: false, found, wanted, do: advice });

  const plain = text.replaceAll(MINUS, "-").replace(NARROW_SPACES, " ").trim();
  if (plain === "") return { ok: false, found: "nothing", wanted, do: `write ${spec.example}` };
  if (DECIMAL_COMMA.test(plain)) return refuse("write the decimals after a point, not a comma");
  const match = NUMBER.exec(plain);
  if (match === null) return refuse(`begin with the number, as in ${spec.example}`);

  const symbol = plain.slice(match[0].length).trim();
  if (symbol === "") {
    return refuse(`write the unit after the number: ${listUnits(spec.units)}`);
  }
  const unit = spec.units.find((candidate) => candidate.symbol === symbol);
  if (unit === undefined) return refuse(adviceOnUnit(kind, symbol));

  // The decimal point is moved in the text, so that 2.3 A is 2300 mA and not 2299.9999999999995.
  const exponent = Number(match[3] ?? "0") + unit.power;
  const value = Number(`${match[1]}${match[2]}e${exponent}`) * unit.times;
  if (!Number.isFinite(value)) return refuse("write a smaller number");
  return { ok: true, value: value === 0 ? 0 : value };
}

/** What to do about a unit that is not one of this kind's. Names near misses. */
function adviceOnUnit(kind: QuantityKind, symbol: string): string {
  const { units } = KINDS[kind];
  const lower = symbol.toLowerCase();
  const sameLetters = units.find((unit) => unit.symbol.toLowerCase() === lower);
  if (sameLetters !== undefined) {
    return `${prefixNote(symbol)}write ${sameLetters.symbol}, in exactly these letters`;
  }
  if (kind === "temperature" && symbol === "K") {
    return "K is a difference of temperatures here; write a temperature in °C";
  }
  if (kind === "difference" && (symbol === "°C" || symbol === "degC")) {
    return "°C is a temperature; write a difference of temperatures in K";
  }
  const meant = MISSPELT[lower];
  if (meant !== undefined && units.some((unit) => unit.symbol === meant)) return `write ${meant}`;
  for (const other of QUANTITY_KINDS) {
    if (KINDS[other].units.some((unit) => unit.symbol === symbol)) {
      return `${symbol} is the unit of ${KINDS[other].name}; write one of ${listUnits(units)}`;
    }
  }
  return `"${clip(symbol)}" is no unit known here; write one of ${listUnits(units)}`;
}

/** A wrong-case unit often names another power of ten; say which, since it may be a factor of 10^9. */
function prefixNote(symbol: string): string {
  const names: Readonly<Record<string, string>> = { M: "mega", m: "milli", k: "kilo", K: "kelvin" };
  const name = symbol.length > 1 ? names[symbol.charAt(0)] : undefined;
  return name === undefined ? "" : `the ${symbol.charAt(0)} of ${clip(symbol)} means ${name}; `;
}

/** The distinct symbols people should type: the look-alike signs are accepted but not advertised. */
function listUnits(units: readonly Unit[]): string {
  return units
    .map((unit) => unit.symbol)
    .filter((symbol) => !/[\u00b5\u03bc\u2126\u03a9\u2103]/.test(symbol))
    .join(", ");
}

const clip = (text: string): string =>
  text.length <= QUANTITY_CHARS_MAX ? text : `${text.slice(0, QUANTITY_CHARS_MAX)}…`;
const quote = (text: string): string => clip(text.replace(/\s+/g, " ").trim());

const NO_BREAK = "\u00a0";

interface Shown {
  readonly symbol: string;
  /** Held units in one shown unit. */
  readonly each: number;
}

/** Units in which people read a kind, largest first; the first whose size is reached is taken. */
const SHOWN: Readonly<Record<QuantityKind, readonly Shown[]>> = {
  current: [shown("A", 1000), shown("mA", 1)],
  temperature: [shown("°C", 1)],
  difference: [shown("K", 1)],
  time: [shown("h", 3_600_000), shown("min", 60_000), shown("s", 1000), shown("ms", 1)],
  slew: [shown("A/s", 1000), shown("mA/s", 1)],
  power: [shown("W", 1000), shown("mW", 1)],
  voltage: [shown("V", 1000), shown("mV", 1)],
  resistance: [shown("kΩ", 1000), shown("Ω", 1)],
  length: [shown("nm", 1)],
  drift: [shown("nm/K", 1)],
  thermal: [shown("K/W", 1)],
  heat: [shown("J/K", 1)],
  dissipation: [shown("mW/K", 1)],
  slope: [shown("W/A", 1)],
  rate: [shown("/s", 1)],
  ratio: [shown("%", 0.01)],
  baud: [shown("baud", 1)],
  count: [shown("counts", 1)],
};

function shown(symbol: string, each: number): Shown {
  return { symbol, each };
}

/**
 * A value for people: `formatQuantity("current", 1800)` is "1.80 A" with a no-break space. Digits
 * follow the resolution (in the held unit; the kind's own where none is given), so that no digit is
 * shown that means nothing. A value that is not finite reads "not known".
 */
export function formatQuantity(
  kind: QuantityKind,
  value: number,
  resolution: number = KINDS[kind].resolution,
): string {
  if (!Number.isFinite(value)) return "not known";
  const choice = pickShown(kind, value);
  const digits = decimalsFor(resolution / choice.each);
  const number = (value / choice.each).toFixed(digits);
  const trimmed = kind === "time" && number.includes(".") ? number.replace(/\.?0+$/, "") : number;
  const signed = Number(trimmed) === 0 ? trimmed.replace("-", "") : trimmed.replace("-", MINUS);
  return `${signed}${NO_BREAK}${choice.symbol}`;
}

/** Currents and voltages read in the large unit from a tenth of it on: 0.40 A, but 20 mA, 282 mW. */
function pickShown(kind: QuantityKind, value: number): Shown {
  const choices = SHOWN[kind];
  const size = Math.abs(value);
  const reach = kind === "current" || kind === "voltage" ? 0.1 : 1;
  // 90 s reads better than 1.5 min, 100 min better than 1.67 h.
  const patience = kind === "time" ? 2 : 1;
  for (const choice of choices) {
    const needed = choice.each * reach * (choice.each > 1000 ? patience : 1);
    if (size >= needed) return choice;
  }
  return choices[choices.length - 1] as Shown;
}

/** Decimals that show steps of `step`: 0 for 1 and above, 2 for 0.01; at most 6. */
function decimalsFor(step: number): number {
  if (!(step > 0)) return 0;
  return Math.min(6, Math.max(0, Math.ceil(-Math.log10(step) - 1e-9)));
}
