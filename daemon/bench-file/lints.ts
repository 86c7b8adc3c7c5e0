import type { Bench } from "../model/bench.ts";
import { lintCurrents } from "./lints/currents.ts";
import { lintHazards } from "./lints/hazards.ts";
import { lintLaws } from "./lints/laws.ts";
import { lintLink } from "./lints/link.ts";
import { lintProtections } from "./lints/protections.ts";
import { lintSensors } from "./lints/sensors.ts";
import type { Finding } from "./problem.ts";

/**
 * Everything about a bench that is wrong or unwise although each value alone is fine. An error
 * refuses the file: such a bench would be unsafe, or could never work. The rest is a warning.
 */
export function lintBench(bench: Bench): Finding[] {
  return [
    ...lintLink(bench),
    ...lintCurrents(bench),
    ...lintLaws(bench),
    ...lintSensors(bench),
    ...lintHazards(bench),
    ...lintProtections(bench),
  ];
}
