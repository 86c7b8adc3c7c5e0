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
  return [
    ...lintLink(bench, measured),
    ...lintCurrents(bench),
    ...lintLaws(bench),
    ...lintSensors(bench),
    ...lintResolution(bench),
    ...lintHazards(bench),
    ...lintProtections(bench),
  ];
}
