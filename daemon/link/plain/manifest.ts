import { crc32Text, hex32 } from "../../../firmware-protocol/crc.ts";
import type { Manifest } from "../../model/manifest.ts";
import type { StreamSpec } from "../../model/stream.ts";

/** Ticks of a stream are milliseconds, its own or this computer's. */
const TICK_us = 1000;
/** More than any current: a stream has no ceiling of its own. */
const ABSOLUTE_counts = 1_000_000_000;

/** The manifest that a bench file makes for its stream: the controller says nothing of itself. */
export function streamManifest(spec: StreamSpec, rate_perS: number): Manifest {
  return {
    id: hex32(crc32Text(JSON.stringify(spec.columns))),
    protocol: 0,
    firmware: "stream",
    serial: "",
    boot: 0,
    tick_us: TICK_us,
    absolute_counts: ABSOLUTE_counts,
    curveCrc: "00000000",
    term_ticks_min: 1,
    term_ticks_max: 4_294_967_295,
    fall_ms: 0,
    rate_perS,
    capabilities: [],
    channels: spec.columns.map((column, index) => ({
      index,
      name: column.channel,
      unit: column.unit,
      perCount: column.perCount,
      count_min: column.count_min,
      count_max: column.count_max,
      group: 0,
    })),
  };
}
