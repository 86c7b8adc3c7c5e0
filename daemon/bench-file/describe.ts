import { type Bench, HAZARD_IDS, type HazardId } from "../model/bench.ts";
import type { Conversion } from "../model/conversion.ts";
import { HAZARD_ROWS } from "../model/hazard-rows.ts";
import { formatQuantity } from "../model/quantities.ts";
import { KINDS, type QuantityKind } from "../model/quantity-units.ts";
import { enforcementWords, type StreamSpec } from "../model/stream.ts";
import { calibrationWords } from "../model/witness.ts";
import { REACTION_ms, slowestRates } from "./lints/hazards.ts";
import { wireShares } from "./lints/link.ts";
import { worstHeating_K } from "./lints/sensors.ts";

/** A bench as places in its file and words, in the file's order: what `differences` compares. */
type Facts = Map<string, string>;

/**
 * What changes from bench `a` to bench `b`, a sentence each, in the order of the file; empty where
 * the two mean the same. For asking before a changed file is taken into use.
 */
export function differences(a: Bench, b: Bench): string[] {
  const before = factsOf(a);
  const after = factsOf(b);
  const sentences: string[] = [];
  for (const place of new Set([...before.keys(), ...after.keys()])) {
    const was = before.get(place);
    const is = after.get(place);
    if (was === is) continue;
    if (was === undefined) sentences.push(`${place} is new: ${is}.`);
    else if (is === undefined) sentences.push(`${place} is gone; it was ${was}.`);
    else sentences.push(`${place} goes from ${was} to ${is}.`);
  }
  return sentences;
}

/**
 * What follows from a bench file without standing in it: how full the line is, and for each row that
 * cuts light its level and the slowest rate that meets its safety time. For `check`.
 */
export function consequences(bench: Bench): string[] {
  const sentences: string[] = [];
  const { stream } = bench.controller;
  if (stream !== undefined) sentences.push(enforcementWords(stream));
  const { up, down } = wireShares(bench);
  if (up > 0 && stream === undefined) {
    const shares = `${formatQuantity("ratio", up)} of the line upward, ${formatQuantity("ratio", down)} downward`;
    sentences.push(`The wire: samples and permits fill at most ${shares}.`);
  }
  for (const [name, { law }] of Object.entries(bench.conversions)) {
    const heating_K = worstHeating_K(law);
    if (heating_K === 0) continue;
    const words = formatQuantity("difference", heating_K, 0.01);
    sentences.push(`The sensor of ${name}: its divider warms it by up to ${words}.`);
  }
  if (stream?.cutOff === null) {
    sentences.push("No row of the hazards cuts the light; each tells when its limit is passed.");
    return sentences;
  }
  sentences.push(
    `Each row below counts ${REACTION_ms} ms for line, judge and fall of the current within its safety time.`,
  );
  for (const { id, slowest_perS } of slowestRates(bench)) {
    const { trip, tripDelay_ms, safety_ms } = bench.hazards[id];
    const level = HAZARD_ROWS[id].level === "fact" ? "" : ` at ${levelWords(id, trip)}`;
    const delay = tripDelay_ms === 0 ? "at once" : `after ${time(tripDelay_ms)}`;
    const rate = formatQuantity("rate", slowest_perS, 0.1);
    sentences.push(
      `${id}: trips${level} ${delay}; dark within ${time(safety_ms)} with ${rate} or more.`,
    );
  }
  return sentences;
}

function factsOf(bench: Bench): Facts {
  const facts: Facts = new Map();
  facts.set("bench", bench.name);
  facts.set("title", bench.title);
  facts.set("light", bench.light);
  addController(facts, bench);
  addDiode(facts, bench);
  addCrystal(facts, bench);
  addCooling(facts, bench);
  addLimits(facts, bench);
  for (const [name, conversion] of Object.entries(bench.conversions)) {
    facts.set(`channels.${name}`, conversionWords(conversion));
  }
  for (const id of HAZARD_IDS) addHazard(facts, bench, id);
  for (const [name, has] of Object.entries(bench.protections)) {
    const key = name.replace(/[A-Z]/g, (letter) => `-${letter.toLowerCase()}`);
    facts.set(`protections.${key}`, has ? "yes" : "no");
  }
  addRecord(facts, bench);
  addWitnesses(facts, bench);
  return facts;
}

/** A changed instrument is asked only by the next start of the daemon. */
function addWitnesses(facts: Facts, { witnesses }: Bench): void {
  for (const witness of witnesses ?? []) {
    const { name, address, query, unit, perRead, period_ms } = witness;
    const where = address.kind === "tcp" ? `${address.host}:${address.port}` : address.path;
    const calibration = calibrationWords(witness);
    const asked = `${query} at ${where} each ${time(period_ms)}, ${perRead} ${unit}`;
    facts.set(`witness.${name}`, calibration === "" ? asked : `${asked}, ${calibration}`);
  }
}

function addRecord(facts: Facts, { record }: Bench): void {
  const { influx } = record;
  if (influx === null) return;
  facts.set("record.influx.url", influx.url);
  facts.set("record.influx.database", influx.database);
  facts.set("record.influx.server", influx.server);
  const { keep_ms } = influx;
  facts.set("record.influx.keep", keep_ms === null ? "none" : exact("time", keep_ms));
}

function addController(facts: Facts, { controller }: Bench): void {
  const { transport } = controller;
  const words =
    transport.kind === "serial"
      ? `serial port ${transport.path} at ${transport.baud} baud`
      : transport.kind === "tcp"
        ? `TCP ${transport.host}:${transport.port}`
        : `the built-in bench, seed ${transport.seed}`;
  facts.set("controller.connect", words);
  facts.set("controller.board", controller.serial ?? "any");
  facts.set("controller.rate", exact("rate", controller.rate_perS));
  facts.set("controller.term", exact("time", controller.term_ms));
  addStream(facts, controller.stream);
}

function addStream(facts: Facts, stream: StreamSpec | undefined): void {
  if (stream === undefined) return;
  const { format, separator, decimals, time, banner, columns, cutOff } = stream;
  facts.set(
    "controller.stream",
    `${format}, separator ${separator}, decimals ${decimals}, time ${time?.from ?? "none"}, banner "${banner}"`,
  );
  for (const { channel, from, unit, perCount } of columns) {
    facts.set(`controller.stream.columns.${channel}`, `${from}, ${perCount} ${unit} a count`);
  }
  if (cutOff !== null) facts.set("controller.cut-off", JSON.stringify(cutOff));
}

function addDiode(facts: Facts, { diode }: Bench): void {
  facts.set("diode.wavelength", exact("length", diode.wavelength_nm));
  facts.set("diode.threshold", exact("current", diode.threshold_mA));
  facts.set("diode.slope", exact("slope", diode.slope_mWpermA));
  facts.set("diode.at", exact("temperature", diode.ref_degC));
  facts.set("diode.threshold-t0", exact("difference", diode.t0_K));
  facts.set("diode.slope-t1", exact("difference", diode.t1_K));
  facts.set("diode.absolute", exact("current", diode.absolute_mA));
  const optional: readonly [string, QuantityKind, number | null][] = [
    ["diode.voltage", "voltage", diode.v0_mV],
    ["diode.resistance", "resistance", diode.rs_ohm],
    ["diode.junction-to-case", "thermal", diode.rjc_KperW],
    ["diode.junction-max", "temperature", diode.junction_degC_max],
  ];
  for (const [place, kind, value] of optional) {
    if (value !== null) facts.set(place, exact(kind, value));
  }
}

function addCrystal(facts: Facts, { crystal }: Bench): void {
  if (crystal === null) return;
  facts.set("crystal.wavelength", exact("length", crystal.wavelength_nm));
  facts.set("crystal.threshold", exact("power", crystal.threshold_mW));
  facts.set("crystal.slope", exact("ratio", crystal.slope));
  facts.set("crystal.line", exact("length", crystal.line_nm));
  facts.set("crystal.line-width", exact("length", crystal.lineWidth_nm));
  facts.set("crystal.depth", String(crystal.depth));
  facts.set("crystal.pump-drift", exact("drift", crystal.pumpDrift_nmPerK));
}

function addCooling(facts: Facts, { cooling }: Bench): void {
  if (cooling === null) return;
  facts.set("cooling.case-to-sink", exact("thermal", cooling.caseToSink_KperW));
  facts.set("cooling.sink-to-room", exact("thermal", cooling.sinkToRoom_KperW));
  facts.set("cooling.case-heat", exact("heat", cooling.case_JperK));
  facts.set("cooling.sink-heat", exact("heat", cooling.sink_JperK));
}

function addLimits(facts: Facts, { limits, derating }: Bench): void {
  facts.set("limits.current", exact("current", limits.current_mA));
  facts.set("limits.slew-up", exact("slew", limits.slewUp_mAperS));
  facts.set("limits.dark-time", exact("time", limits.darkTime_ms));
  facts.set("limits.recover", exact("difference", limits.recover_K));
  facts.set("limits.recover-after", exact("time", limits.recover_ms));
  const points = derating.map(
    (point) => `${exact("current", point.current_mA)} at ${exact("temperature", point.case_degC)}`,
  );
  facts.set("derating", points.join(", "));
}

function addHazard(facts: Facts, bench: Bench, id: HazardId): void {
  const row = HAZARD_ROWS[id];
  // Rows that follow from other places change with those, and are told there.
  if (row.follows !== null) return;
  const levels = bench.hazards[id];
  facts.set(`hazards.${id}.warn`, after(id, levels.warn, levels.warnDelay_ms));
  facts.set(`hazards.${id}.trip`, after(id, levels.trip, levels.tripDelay_ms));
  facts.set(`hazards.${id}.safety-time`, time(levels.safety_ms));
  if (row.level === "fact") return;
  const kind = row.level === "temperature" ? "difference" : row.level;
  facts.set(`hazards.${id}.deadband`, exact(kind, levels.deadband));
}

const time = (value: number): string => exact("time", value);
const levelWords = (id: HazardId, value: number | null): string => {
  const { level } = HAZARD_ROWS[id];
  if (value === null) return "none";
  return level === "fact" ? "yes" : exact(level, value);
};
const after = (id: HazardId, value: number | null, delay_ms: number): string =>
  value === null ? "none" : `${levelWords(id, value)} after ${time(delay_ms)}`;

function conversionWords({ version, law, error }: Conversion): string {
  const end = `error ${error}, version ${version}`;
  if (law.kind === "linear") return `${law.perCount} a count from ${law.offset}, ${end}`;
  const { divider } = law;
  const heating =
    divider.heating === undefined
      ? ""
      : `, ${exact("voltage", divider.heating.supply_mV)}, ${exact("dissipation", divider.heating.dissipation_mWperK)}`;
  const place = `${divider.sensor}, fixed ${exact("resistance", divider.fixed_ohm)}, full ${divider.full_counts} counts${heating}`;
  const constants =
    law.kind === "ntc"
      ? `r25 ${exact("resistance", law.r25_ohm)}, beta ${exact("difference", law.beta_K)}`
      : law.kind === "platinum"
        ? `r0 ${exact("resistance", law.r0_ohm)}`
        : `a ${law.a}, b ${law.b}, c ${law.c}`;
  return `${law.kind} with ${constants}, ${place}, ${end}`;
}

/** A value with as many digits as it needs, so that a small change is seen to be one. */
function exact(kind: QuantityKind, value: number): string {
  let step = KINDS[kind].resolution;
  for (let n = 0; n < 6 && !isMultiple(value, step); n += 1) step /= 10;
  return formatQuantity(kind, value, step);
}

const isMultiple = (value: number, step: number): boolean =>
  Math.abs(value / step - Math.round(value / step)) < 1e-6;
