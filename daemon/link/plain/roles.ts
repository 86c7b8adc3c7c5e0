/** What a printed column may be, by its name, its unit and its values. Guesses, each with its trust. */

export interface Role {
  readonly channel: string;
  readonly kind: "current" | "temperature" | "power" | "voltage" | "ratio" | "time" | "other";
}

/** Names that firmware gives its columns; the first that fits is taken. Common practice, no source. */
const ROLES: readonly (readonly [RegExp, string, Role["kind"]])[] = [
  [
    /^(millis|micros|time ?stamp|timestamp|uptime|elapsed|time|ms|us|sec|secs|seconds|ts|t ms|t s|t us)$/,
    "time",
    "time",
  ],
  [/(set ?point|target|^set|iset|i set|set i|\bcmd\b|demand).*|.*\b(set|sp)$/, "set", "current"],
  [/(sink|\bhs\b|thsink|tsink|base ?plate)/, "sink", "temperature"],
  [/(ambient|\bamb\b|tamb|room|\bair\b)/, "ambient", "temperature"],
  [
    /^(i|il|ild|i ld|ilaser|i laser|i diode|idiode|i meas|imeas|i out|i act|cur|curr|current|amps|amp|ma|laser ?current|diode ?current|ld ?current|pump ?current|drive ?current|measured ?current|laser cur|ld cur)$/,
    "current",
    "current",
  ],
  [/current$/, "current", "current"],
  [
    /^(t|tc|t1|temp|temp1|temperature|tcase|t case|case|case ?temp|case ?temperature|tld|t ld|t diode|tdiode|t laser|diode ?temp|diode ?temperature|laser ?temp|laser ?temperature|ld temp|ntc|therm|thermistor|degc|temp c)$/,
    "case",
    "temperature",
  ],
  [/(temp|temperature)$/, "case", "temperature"],
  [
    /^(pd|photo|photodiode|photo ?diode|light|power|popt|p opt|p|pout|p out|output|optical|optical ?power|output ?power|laser ?power|monitor|mon|lpm|pmon|mw|out)$/,
    "photodiode",
    "power",
  ],
  [/power$/, "photodiode", "power"],
  [
    /^(v|vf|v f|vld|v ld|vdiode|u|uf|volt|volts|voltage|forward|forward ?voltage|diode ?voltage)$/,
    "forward",
    "voltage",
  ],
  [/^(vcc|vdd|vin|v in|vs|vbus|supply|supply ?voltage|bat|battery)$/, "supply", "voltage"],
  [/^(rh|hum|humidity)$/, "humidity", "ratio"],
];

/** A name as words: units, signs and letters' cases apart. */
const wordsOf = (name: string): string =>
  name
    .replace(/([a-z])([A-Z])/g, "$1 $2")
    .replace(/[_./-]+/g, " ")
    .trim()
    .toLowerCase()
    .replace(/\s+/g, " ");

/** The role that a name tells; null where it tells none. */
export function roleOf(name: string): Role | null {
  const words = wordsOf(name);
  for (const [pattern, channel, kind] of ROLES) {
    if (pattern.test(words)) return { channel, kind };
  }
  return null;
}

/** How a printed unit is written in a bench file, with what turns it into one that is known there. */
export interface UnitWords {
  readonly unit: string;
  readonly kind: Role["kind"];
  readonly scale: number;
  readonly offset: number;
}

const plain = (unit: string, kind: Role["kind"]): UnitWords => ({
  unit,
  kind,
  scale: 1,
  offset: 0,
});
const CELSIUS = plain("°C", "temperature");
/** 0 °C in kelvin, and the fahrenheit scale (both exact by definition). */
const KELVIN: UnitWords = { ...CELSIUS, offset: -273.15 };
const FAHRENHEIT: UnitWords = { ...CELSIUS, scale: 5 / 9, offset: (-32 * 5) / 9 };

const UNITS: Readonly<Record<string, UnitWords>> = {
  A: plain("A", "current"),
  mA: plain("mA", "current"),
  uA: plain("uA", "current"),
  "°C": CELSIUS,
  degC: CELSIUS,
  C: CELSIUS,
  K: KELVIN,
  F: FAHRENHEIT,
  degF: FAHRENHEIT,
  "°F": FAHRENHEIT,
  W: plain("W", "power"),
  mW: plain("mW", "power"),
  uW: plain("uW", "power"),
  V: plain("V", "voltage"),
  mV: plain("mV", "voltage"),
  "%": plain("%", "ratio"),
  ms: plain("ms", "time"),
  s: plain("s", "time"),
  us: plain("us", "time"),
};
/** Spellings in names and headings, where case is often lost. */
const LOOSE: Readonly<Record<string, string>> = {
  ma: "mA",
  amp: "A",
  amps: "A",
  a: "A",
  c: "°C",
  degc: "°C",
  celsius: "°C",
  k: "K",
  f: "F",
  degf: "F",
  w: "W",
  mw: "mW",
  watt: "W",
  v: "V",
  mv: "mV",
  volts: "V",
  percent: "%",
  pct: "%",
  ms: "ms",
  s: "s",
  sec: "s",
  us: "us",
};

/** Units that may stand behind a number, as a pattern; longer ones first. */
export const UNIT_PATTERN = "degC|degF|°C|°F|mA|uA|µA|mW|uW|µW|mV|ms|us|µs|A|C|K|F|W|V|%|s";

export const unitOf = (text: string): UnitWords | null => UNITS[text.replace(/[µμ]/g, "u")] ?? null;

/** Name and unit of a heading or key such as `I (mA)`, `T[°C]`, `temp_c`; the unit may be missing. */
export function splitName(text: string): {
  readonly name: string;
  readonly unit: UnitWords | null;
} {
  const bracketed = /^(.*?)\s*[([]\s*([^)\]]{1,10})\s*[)\]]$/.exec(text.trim());
  if (bracketed !== null) {
    const inside = bracketed[2] ?? "";
    return {
      name: (bracketed[1] ?? "").trim(),
      unit: unitOf(inside) ?? unitOf(LOOSE[inside.toLowerCase()] ?? ""),
    };
  }
  const tail = /^(.{1,28})[_ -]([A-Za-z°%]{1,8})$/.exec(text.trim());
  const unit = tail === null ? null : (unitOf(tail[2] ?? "") ?? unitOf(LOOSE[tail[2] ?? ""] ?? ""));
  if (tail !== null && unit !== null) return { name: tail[1] ?? "", unit };
  return { name: text.trim(), unit: null };
}
