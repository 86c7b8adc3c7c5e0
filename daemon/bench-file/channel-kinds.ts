import type { Conversion } from "../model/conversion.ts";
import { KINDS, type QuantityKind } from "../model/quantity-units.ts";
import type { Finding } from "./problem.ts";
import type { FreeQuantity } from "./schema-channels.ts";

/** What channels of these names are measured in. Other names are free. */
const BY_NAME: Readonly<Record<string, QuantityKind>> = {
  set: "current",
  current: "current",
  case: "temperature",
  sink: "temperature",
  ambient: "temperature",
  photodiode: "power",
  forward: "voltage",
  supply: "voltage",
  humidity: "ratio",
};

export interface ChannelUnits {
  readonly error: FreeQuantity;
  readonly perCount: FreeQuantity | null;
  readonly offset: FreeQuantity | null;
}

/** Units of a channel's conversion that do not fit its name or each other, and impossible values. */
export function kindFindings(name: string, units: ChannelUnits): Finding[] {
  const { error, perCount, offset } = units;
  // Sensors with a law of their own read temperature; a linear one says its kind by its unit.
  const lawKind = perCount === null ? "temperature" : scaleOf(offset?.kind ?? perCount.kind);
  const value = BY_NAME[name] ?? lawKind;
  const step = value === "temperature" ? "difference" : value;
  return [
    ...mismatch([name, "error"], error, step),
    ...impossible(name, units),
    ...(perCount === null ? [] : mismatch([name, "linear", "per-count"], perCount, step)),
    ...(offset === null ? [] : mismatch([name, "linear", "offset"], offset, value)),
  ];
}

/**
 * Unit in which the program holds a converted channel; null where its name is free and its law
 * linear, so that only the bench file's words know it.
 */
export function convertedUnit(name: string, { law }: Conversion): string | null {
  const kind = BY_NAME[name] ?? (law.kind === "linear" ? null : "temperature");
  return kind === null ? null : KINDS[kind].held;
}

/** A step in kelvin is a step of a temperature. */
const scaleOf = (kind: QuantityKind): QuantityKind =>
  kind === "difference" ? "temperature" : kind;

function mismatch(path: readonly string[], found: FreeQuantity, wanted: QuantityKind): Finding[] {
  if (found.kind === wanted) return [];
  return [
    {
      level: "error",
      code: "unit",
      path: ["channels", ...path],
      found: KINDS[found.kind].name,
      wanted: `${KINDS[wanted].name}, such as ${KINDS[wanted].example}`,
      do: `write it in the unit of ${KINDS[wanted].name}`,
    },
  ];
}

/** A negative error would lift the ceiling above what the sensor read; a zero scale reads nothing. */
function impossible(name: string, { error, perCount }: ChannelUnits): Finding[] {
  const findings: Finding[] = [];
  const refuse = (path: readonly string[], found: string, wanted: string, advice: string): void => {
    const at = ["channels", name, ...path];
    findings.push({ level: "error", code: "range", path: at, found, wanted, do: advice });
  };
  if (error.value < 0) {
    const wanted = "half the width of the reading's stated error, zero or more";
    refuse(["error"], "an error below zero", wanted, "write it without the minus");
  }
  if (perCount?.value === 0) {
    const wanted = "what one count stands for";
    refuse(["linear", "per-count"], "zero a count", wanted, "write the channel's scale");
  }
  return findings;
}
