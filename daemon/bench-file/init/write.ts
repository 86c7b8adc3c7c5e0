import { KINDS, type QuantityKind } from "../../model/quantity-units.ts";
import { photon_eV } from "../../physics/photon.ts";
import { permitPeriod_ms } from "../lints/link.ts";
import { type InitAnswers, PROTECTION_KEYS, type ThermistorAnswer } from "./answers.ts";

/** Laws that no data sheet page one has; usual for near-infrared diodes. Common practice, no source. */
const T0_K = 120;
const T1_K = 350;
/** A hardware clamp at 110 % of the limit shall still lie under the absolute maximum. */
const CLAMP = 1.1;
/** The derating falls over this many kelvin below the case's limit, to this share of the limit. */
const FALL_K = 20;
const FALL_SHARE = 0.5;
/** A warning stands this far before the case's limit. */
const WARN_K = 5;
const TERM_ms = 500;
/** A thermistor of 1 % on a resistor of 1 %, uncalibrated. Common practice, no source. */
const THERMISTOR_ERROR_K = 1;
/** An uncalibrated photodiode: this share of the light at the limit. */
const PHOTODIODE_SHARE = 0.05;

/** A value as people write it, exact to six digits. */
export function written(kind: QuantityKind, value: number): string {
  const large = { current: "A", power: "W", voltage: "V", resistance: "kohm" } as const;
  const digits = (n: number): string => String(Number(n.toPrecision(6)));
  const floor = kind === "resistance" ? 1000 : 100;
  if (kind in large && Math.abs(value) >= floor) {
    return `${digits(value / 1000)} ${large[kind as keyof typeof large]}`;
  }
  if (kind === "slope") return `${digits(value)} W/A`;
  if (kind === "ratio") return `${digits(value * 100)} %`;
  const held = KINDS[kind].units.find((unit) => unit.power === 0 && unit.times === 1);
  return `${digits(value)} ${held?.symbol ?? ""}`;
}

/**
 * A commented bench file from answers. What was not asked stands in it with a usual value and says
 * so. The caller reads it back with `parseBench` before it is written to a disk.
 * @param schema where an editor finds the JSON Schema, as an address or a path
 */
export function writeBench(answers: InitAnswers, schema: string): string {
  return [
    `# yaml-language-server: $schema=${schema}`,
    ...head(answers),
    ...controller(answers),
    ...diode(answers),
    ...limits(answers),
    ...channels(answers),
    ...hazards(answers),
    ...protections(answers),
  ].join("\n");
}

function head({ name, title }: InitAnswers): string[] {
  return [
    "# A bench file: one laser with its controller. Every quantity carries its unit. What is marked",
    '# "usual" was not asked: it is common practice without a source, and a data sheet always wins.',
    "# Ask `beamsitter check` with this file's name after each change.",
    "",
    `bench: ${name}`,
    `title: ${JSON.stringify(title)}`,
    "light: continuous  # the only kind so far: peak and mean current must be the same",
    "",
  ];
}

function controller({ connect, board, rate_perS, stream }: InitAnswers): string[] {
  const how =
    connect.kind === "serial"
      ? [
          "    kind: serial",
          `    path: ${JSON.stringify(connect.path)}  # \`beamsitter ports\` lists what is there`,
          `    baud: ${connect.baud} baud`,
        ]
      : ["    kind: tcp", `    host: ${JSON.stringify(connect.host)}`, `    port: ${connect.port}`];
  const term_ms = Math.max(TERM_ms, Math.ceil((5 * permitPeriod_ms(rate_perS)) / 10) * 10);
  const which = board === "any" ? "# better: the serial number that your board tells" : "";
  return [
    "controller:",
    "  connect:",
    ...how,
    `  board: ${board}  ${which}`.trimEnd(),
    `  rate: ${written("rate", rate_perS)}   # samples a second; every sample is judged`,
    `  term: ${term_ms} ms  # how long light may go on after the last judged sample`,
    ...(stream ?? []).map((line) => (line === "" ? "" : `  ${line}`)),
    "",
  ];
}

function diode(answers: InitAnswers): string[] {
  const { operating_mA, operating_mV, wavelength_nm, drift_nmPerK } = answers;
  const lines = [
    "diode:",
    `  wavelength: ${written("length", wavelength_nm)}`,
    `  threshold: ${written("current", answers.threshold_mA)}  # below it there is no laser light`,
    `  slope: ${written("slope", answers.slope_mWpermA)}      # light per current above threshold`,
    `  at: ${written("temperature", answers.at_degC)}          # temperature at which these hold`,
    `  threshold-t0: ${T0_K} K  # usual; threshold grows by exp((T - at) / t0)`,
    `  slope-t1: ${T1_K} K      # usual; slope shrinks by exp(-(T - at) / t1)`,
    `  absolute: ${written("current", answers.absolute_mA)}  # the data sheet's absolute maximum`,
  ];
  if (operating_mV !== null) {
    // The line is drawn through the operating point, and at zero current through one photon's energy.
    const v0_mV = Math.round(Math.min(1000 * photon_eV(wavelength_nm), 0.9 * operating_mV));
    const rs_ohm = (operating_mV - v0_mV) / operating_mA;
    lines.push(
      `  # ${written("voltage", operating_mV)} at ${written("current", operating_mA)}, as a straight line from one photon's energy:`,
      `  voltage: ${written("voltage", v0_mV)}`,
      `  resistance: ${written("resistance", rs_ohm)}`,
    );
  } else lines.push("  # voltage and resistance are not known; heat is then not known either.");
  lines.push(
    "  # junction-to-case: 8 K/W  # with both of these the junction limits the current too",
    "  # junction-max: 80 °C",
    "",
    "# crystal:  # where the diode pumps a crystal: what check asks for stands in north.yaml",
    `#   pump-drift: ${drift_nmPerK === null ? "0.3 nm/K  # usual" : written("drift", drift_nmPerK)}`,
    "",
  );
  return lines;
}

/** The bench's limit: the operating current, with room for a clamp, in whole steps of 1 mA. */
const limitOf = ({ operating_mA, absolute_mA }: InitAnswers): number =>
  Math.max(1, Math.floor(Math.min(operating_mA, absolute_mA / CLAMP)));

function limits(answers: InitAnswers): string[] {
  const { case_degC_min, case_degC_max } = answers;
  const limit_mA = limitOf(answers);
  const from_degC = Math.max(case_degC_min, case_degC_max - FALL_K);
  const slew_mAperS = Math.max(1, Math.ceil(limit_mA / 10));
  return [
    "limits:",
    `  current: ${written("current", limit_mA)}  # operating current, a clamp at 110 % still under the maximum`,
    `  slew-up: ${written("slew", slew_mAperS)}  # upward only; a falling limit acts at once`,
    "",
    "# The most current a case of that temperature allows: straight lines between the points, nothing",
    "# above the last. Usual; put in the derating of your diode's data sheet.",
    "derating:",
    `  - { case: ${written("temperature", from_degC)}, current: ${written("current", limit_mA)} }`,
    `  - { case: ${written("temperature", case_degC_max)}, current: ${written("current", Math.floor(limit_mA * FALL_SHARE))} }`,
    "",
  ];
}

function channels(answers: InitAnswers): string[] {
  const { thermistor, photodiode_mW, slope_mWpermA, threshold_mA } = answers;
  const lines = thermistor === null ? [] : thermistorLines(thermistor);
  if (photodiode_mW !== null) {
    const light_mW = Math.max(0, slope_mWpermA * (limitOf(answers) - threshold_mA));
    const error_mW = Math.max(photodiode_mW, PHOTODIODE_SHARE * light_mW);
    lines.push(
      "  photodiode:",
      `    error: ${written("power", error_mW)}  # usual; calibrate against a power meter`,
      `    linear: { per-count: ${written("power", photodiode_mW)} }`,
    );
  }
  if (lines.length === 0) {
    return [
      "# channels:  # how raw counts become units; without it the board's own scale is taken",
      "",
    ];
  }
  return ["# How raw counts become units.", "channels:", ...lines, ""];
}

function thermistorLines({ r25_ohm, beta_K, fixed_ohm, full_counts }: ThermistorAnswer): string[] {
  return [
    "  case:",
    `    error: ${THERMISTOR_ERROR_K} K  # usual; the ceiling is taken at reading + error`,
    "    ntc:",
    `      r25: ${written("resistance", r25_ohm)}`,
    `      beta: ${written("difference", beta_K)}`,
    `      fixed: ${written("resistance", fixed_ohm)}   # the resistor that makes the divider`,
    "      place: to-ground  # where the thermistor sits: warmer means fewer counts",
    `      full: ${full_counts} counts`,
  ];
}

function hazards({ case_degC_max }: InitAnswers): string[] {
  const warn = written("temperature", case_degC_max - WARN_K);
  return [
    "# Rows and keys that are left out keep their defaults; `beamsitter check --explain case-over`",
    "# tells what a row does.",
    "hazards:",
    `  case-over: { warn: ${warn}, trip: ${written("temperature", case_degC_max)} }`,
    "",
  ];
}

function protections({ protections: has }: InitAnswers): string[] {
  return [
    "# What the bench has in hardware. The program takes your word and names what is missing.",
    "protections:",
    ...PROTECTION_KEYS.map((key) => `  ${key}: ${has[key] ? "yes" : "no"}`),
    "",
  ];
}
