/**
 * The table of quantities: which units each kind may be written in, and the one unit in which the
 * program holds it. `quantities.ts` reads and writes by this table; there is no other list of units.
 */

export const QUANTITY_KINDS = [
  "current",
  "temperature",
  "difference",
  "time",
  "slew",
  "power",
  "voltage",
  "resistance",
  "length",
  "drift",
  "thermal",
  "heat",
  "dissipation",
  "slope",
  "rate",
  "ratio",
  "baud",
  "count",
] as const;
export type QuantityKind = (typeof QUANTITY_KINDS)[number];

/** One unit: value in the held unit = number × times × 10^power. */
export interface Unit {
  readonly symbol: string;
  readonly times: number;
  /** Kept apart from `times` so that 2.3 A becomes exactly 2300 mA: the decimal point is moved. */
  readonly power: number;
}

export interface Kind {
  /** With its article, for sentences: "a current". */
  readonly name: string;
  /** Unit in which the program holds the value; also the suffix of names that hold it. */
  readonly held: string;
  readonly example: string;
  readonly units: readonly Unit[];
  /** Step to which people read the value when no resolution is given, in the held unit. */
  readonly resolution: number;
}

const unit = (symbol: string, power = 0, times = 1): Unit => ({ symbol, times, power });
const kind = (
  name: string,
  held: string,
  example: string,
  resolution: number,
  units: readonly Unit[],
): Kind => ({ name, held, example, resolution, units });

// Both micro signs (U+00B5 and U+03BC) and both ohm signs (U+03A9 and U+2126) come from keyboards.
const micro = (rest: string, power: number): Unit[] =>
  ["u", "\u00b5", "\u03bc"].map((prefix) => unit(prefix + rest, power));
const ohm = (prefix: string, power: number): Unit[] =>
  ["ohm", "\u03a9", "\u2126"].map((symbol) => unit(prefix + symbol, power));

export const KINDS: Readonly<Record<QuantityKind, Kind>> = {
  current: kind("a current", "mA", "1.8 A", 10, [unit("mA"), unit("A", 3), ...micro("A", -3)]),
  temperature: kind("a temperature", "degC", "45 °C", 0.1, [
    unit("°C"),
    unit("degC"),
    unit("\u2103"),
  ]),
  difference: kind("a temperature difference", "K", "2 K", 0.1, [unit("K"), unit("mK", -3)]),
  time: kind("a time", "ms", "10 min", 1, [
    unit("ms"),
    unit("s", 3),
    unit("min", 4, 6),
    unit("h", 5, 36),
    unit("d", 5, 864),
    ...micro("s", -3),
  ]),
  slew: kind("a rate of change of current", "mAperS", "200 mA/s", 1, [
    unit("mA/s"),
    unit("A/s", 3),
  ]),
  power: kind("a power", "mW", "1.5 W", 10, [unit("mW"), unit("W", 3), ...micro("W", -3)]),
  voltage: kind("a voltage", "mV", "1.85 V", 10, [unit("mV"), unit("V", 3), ...micro("V", -3)]),
  resistance: kind("a resistance", "ohm", "10 kohm", 1, [
    ...ohm("", 0),
    ...ohm("k", 3),
    ...ohm("m", -3),
    ...ohm("M", 6),
  ]),
  length: kind("a wavelength", "nm", "808 nm", 0.1, [unit("nm"), unit("pm", -3), ...micro("m", 3)]),
  drift: kind("a drift of wavelength", "nmPerK", "0.3 nm/K", 0.01, [
    unit("nm/K"),
    unit("pm/K", -3),
    unit("nm/°C"),
  ]),
  thermal: kind("a thermal resistance", "KperW", "8 K/W", 0.01, [unit("K/W"), unit("°C/W")]),
  heat: kind("a heat capacity", "JperK", "60 J/K", 0.1, [unit("J/K"), unit("J/°C")]),
  dissipation: kind("a dissipation constant", "mWperK", "1.5 mW/K", 0.1, [
    unit("mW/K"),
    unit("mW/°C"),
  ]),
  slope: kind("a slope efficiency", "mWpermA", "1.05 W/A", 0.01, [
    unit("mW/mA"),
    unit("W/A"),
    unit("mW/A", -3),
  ]),
  rate: kind("a rate", "perS", "50 /s", 1, [unit("/s"), unit("1/s"), unit("Hz"), unit("kHz", 3)]),
  ratio: kind("a share", "ratio", "5 %", 0.01, [
    unit("%", -2),
    unit("\u2030", -3),
    unit("ppm", -6),
  ]),
  baud: kind("a line rate", "baud", "115200 baud", 1, [unit("baud"), unit("kbaud", 3)]),
  count: kind("a number of counts", "counts", "16384 counts", 1, [unit("counts"), unit("count")]),
};

/** Spellings that people type and that are not units here, with the unit that is meant. */
export const MISSPELT: Readonly<Record<string, string>> = {
  amp: "A",
  amps: "A",
  ampere: "A",
  milliamp: "mA",
  milliamps: "mA",
  celsius: "°C",
  c: "°C",
  deg: "°C",
  "deg c": "°C",
  "°": "°C",
  º: "°C",
  ºc: "°C",
  kelvin: "K",
  sec: "s",
  secs: "s",
  second: "s",
  seconds: "s",
  msec: "ms",
  minute: "min",
  minutes: "min",
  mins: "min",
  m: "min",
  hour: "h",
  hours: "h",
  hr: "h",
  hrs: "h",
  day: "d",
  days: "d",
  watt: "W",
  watts: "W",
  volt: "V",
  volts: "V",
  ohms: "ohm",
  kohms: "kohm",
  k: "kohm",
  r: "ohm",
  percent: "%",
  pct: "%",
  bps: "baud",
  bd: "baud",
  "bit/s": "baud",
  sps: "/s",
  "per second": "/s",
  lsb: "counts",
  cts: "counts",
};
