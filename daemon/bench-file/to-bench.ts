import type {
  Bench,
  ControllerPart,
  DiodePart,
  ProtectionsPart,
  RecordPart,
  TransportSpec,
} from "../model/bench.ts";
import type { Conversion, Divider, Law } from "../model/conversion.ts";
import { kindFindings } from "./channel-kinds.ts";
import type { Finding } from "./problem.ts";
import type { BenchFile } from "./schema.ts";
import { hazardLevels } from "./schema-hazards.ts";
import { witnessesOf } from "./schema-witness.ts";
import { type StreamParts, streamOf } from "./to-stream.ts";

/** The bench of a file whose every value has been read; findings are combinations that cannot be. */
export function toBench(file: BenchFile): { bench: Bench; findings: Finding[] } {
  const findings: Finding[] = [];
  const stream = streamOf(file, findings);
  const controller = controllerOf(file, stream, findings);
  const bench: Bench = {
    name: file.bench,
    title: file.title === "" ? file.bench : file.title,
    light: file.light,
    controller,
    diode: diodeOf(file),
    crystal: crystalOf(file),
    cooling: coolingOf(file),
    limits: {
      current_mA: file.limits.current,
      slewUp_mAperS: file.limits["slew-up"],
      darkTime_ms: file.limits["dark-time"],
      recover_K: file.limits.recover,
      recover_ms: file.limits["recover-after"],
    },
    derating: file.derating.map((point) => ({ case_degC: point.case, current_mA: point.current })),
    conversions: { ...stream?.conversions, ...conversionsOf(file, findings) },
    hazards: hazardLevels(file.hazards ?? {}, {
      rate_perS: controller.rate_perS,
      term_ms: controller.term_ms,
      darkTime_ms: file.limits["dark-time"],
    }),
    protections: protectionsOf(file),
    record: recordOf(file),
    witnesses: witnessesOf(file.witness ?? {}, findings),
  };
  return { bench, findings };
}

/** A watched bench has no permits; the term is then only how long samples may stay out. */
const TERM_PERIODS_WATCHED = 5;

function controllerOf(
  file: BenchFile,
  stream: StreamParts | null,
  findings: Finding[],
): ControllerPart {
  const { connect, board, rate, term } = file.controller;
  const missing = (key: string, example: string): void => {
    findings.push({
      level: "error",
      code: "missing",
      path: ["controller", "connect", key],
      found: "nothing",
      wanted: `${key}, because the board is reached by ${connect.kind}`,
      do: `add ${key}, such as ${example}`,
    });
  };
  if (connect.kind === "serial" && connect.path === "") missing("path", "/dev/ttyACM0");
  if (connect.kind === "tcp" && connect.host === "") missing("host", "192.168.1.20");
  if (connect.kind === "tcp" && connect.port === 0) missing("port", "4160");
  const part: ControllerPart = {
    transport: transportOf(connect),
    serial: board === "any" ? null : board,
    rate_perS: rate,
    term_ms: term,
  };
  if (stream === null) return part;
  const term_ms = Math.max(term, (TERM_PERIODS_WATCHED * 1000) / rate);
  return { ...part, term_ms, stream: stream.spec };
}

function transportOf(connect: BenchFile["controller"]["connect"]): TransportSpec {
  if (connect.kind === "serial") return { kind: "serial", path: connect.path, baud: connect.baud };
  if (connect.kind === "tcp") return { kind: "tcp", host: connect.host, port: connect.port };
  return { kind: "built-in", seed: connect.seed };
}

function diodeOf({ diode }: BenchFile): DiodePart {
  return {
    wavelength_nm: diode.wavelength,
    threshold_mA: diode.threshold,
    slope_mWpermA: diode.slope,
    ref_degC: diode.at,
    t0_K: diode["threshold-t0"],
    t1_K: diode["slope-t1"],
    v0_mV: diode.voltage ?? null,
    rs_ohm: diode.resistance ?? null,
    absolute_mA: diode.absolute,
    rjc_KperW: diode["junction-to-case"] ?? null,
    junction_degC_max: diode["junction-max"] ?? null,
  };
}

function crystalOf({ crystal }: BenchFile): Bench["crystal"] {
  if (crystal === undefined) return null;
  return {
    wavelength_nm: crystal.wavelength,
    threshold_mW: crystal.threshold,
    slope: crystal.slope,
    line_nm: crystal.line,
    lineWidth_nm: crystal["line-width"],
    depth: crystal.depth,
    pumpDrift_nmPerK: crystal["pump-drift"],
  };
}

function coolingOf({ cooling }: BenchFile): Bench["cooling"] {
  if (cooling === undefined) return null;
  return {
    caseToSink_KperW: cooling["case-to-sink"],
    sinkToRoom_KperW: cooling["sink-to-room"],
    case_JperK: cooling["case-heat"],
    sink_JperK: cooling["sink-heat"],
  };
}

function protectionsOf({ protections }: BenchFile): ProtectionsPart {
  return {
    key: protections?.key ?? false,
    interlockLoop: protections?.["interlock-loop"] ?? false,
    emissionWarning: protections?.["emission-warning"] ?? false,
    beamStop: protections?.["beam-stop"] ?? false,
    manualReset: protections?.["manual-reset"] ?? false,
    toggledEnable: protections?.["toggled-enable"] ?? false,
  };
}

function recordOf({ record }: BenchFile): RecordPart {
  const influx = record?.influx;
  if (influx === undefined) return { influx: null };
  const fileOr = (path: string): string | null => (path === "" ? null : path);
  return {
    influx: {
      url: influx.url,
      database: influx.database,
      server: influx.server,
      keep_ms: influx.keep,
      caFile: fileOr(influx["ca-file"]),
      credentialsFile: fileOr(influx["credentials-file"]),
      pages: influx.pages,
    },
  };
}

type ChannelFile = NonNullable<BenchFile["channels"]>[string];

function conversionsOf(file: BenchFile, findings: Finding[]): Record<string, Conversion> {
  const conversions: Record<string, Conversion> = Object.create(null);
  for (const [name, channel] of Object.entries(file.channels ?? {})) {
    findings.push(
      ...kindFindings(name, {
        error: channel.error,
        perCount: channel.linear?.["per-count"] ?? null,
        offset: channel.linear?.offset ?? null,
      }),
    );
    const laws = lawsOf(channel);
    const [law] = laws;
    if (law !== undefined && laws.length === 1) {
      conversions[name] = { version: channel.version, law, error: channel.error.value };
      continue;
    }
    findings.push({
      level: "error",
      code: "law",
      path: ["channels", name],
      found: laws.length === 0 ? "no law" : `${laws.length} laws`,
      wanted: "exactly one of linear, ntc, steinhart-hart, platinum",
      do: "keep the law that fits this sensor",
    });
  }
  return conversions;
}

function lawsOf(channel: ChannelFile): Law[] {
  const laws: Law[] = [];
  const { linear, ntc, platinum } = channel;
  const sh = channel["steinhart-hart"];
  if (linear !== undefined) {
    const offset = linear.offset?.value ?? 0;
    laws.push({ kind: "linear", perCount: linear["per-count"].value, offset });
  }
  if (ntc !== undefined) {
    laws.push({ kind: "ntc", divider: dividerOf(ntc), r25_ohm: ntc.r25, beta_K: ntc.beta });
  }
  if (sh !== undefined) {
    laws.push({ kind: "steinhart-hart", divider: dividerOf(sh), a: sh.a, b: sh.b, c: sh.c });
  }
  if (platinum !== undefined) {
    laws.push({ kind: "platinum", divider: dividerOf(platinum), r0_ohm: platinum.r0 });
  }
  return laws;
}

interface DividerFile {
  readonly fixed: number;
  readonly place: Divider["sensor"];
  readonly full: number;
  readonly supply?: number | undefined;
  readonly dissipation?: number | undefined;
}

function dividerOf({ fixed, place, full, supply, dissipation }: DividerFile): Divider {
  const divider = { fixed_ohm: fixed, sensor: place, full_counts: full };
  if (supply === undefined || dissipation === undefined) return divider;
  return { ...divider, heating: { supply_mV: supply, dissipation_mWperK: dissipation } };
}
