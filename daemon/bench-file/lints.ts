import type { Bench } from "../model/bench.ts";
import { lintCurrents } from "./lints/currents.ts";
import { lintHazards } from "./lints/hazards.ts";
import { lintLaws } from "./lints/laws.ts";
import { lintLink, type Measured } from "./lints/link.ts";
import { lintProtections } from "./lints/protections.ts";
import { lintResolution } from "./lints/resolution.ts";
import { lintSensors } from "./lints/sensors.ts";
import type { Finding } from "./problem.ts";

/**
 * Everything about a bench that is wrong or unwise although each value alone is fine. An error
 * refuses the file: such a bench would be unsafe, or could never work. The rest is a warning.
 */
export function lintBench(bench: Bench, measured: Measured): Finding[] {
  // A watched bench has no permits on its wire.
  const link = bench.controller.stream === undefined ? lintLink(bench, measured) : [];
  return [
    ...link,
    ...lintCurrents(bench),
    ...lintLaws(bench),
    ...lintSensors(bench),
    ...lintResolution(bench),
    ...lintHazards(bench).flatMap((finding) => watched(bench, finding)),
    ...lintProtections(bench),
  ];
}

/** Rows that need a faster stream: nothing to say where nothing cuts, a doubt where something does. */
const TOO_SLOW = /^(rate-slow|too-late)$/;

function watched({ controller }: Bench, finding: Finding): Finding[] {
  if (controller.stream === undefined || !TOO_SLOW.test(finding.code)) return [finding];
  return controller.stream.cutOff === null ? [] : [{ ...finding, level: "warning" }];
}
