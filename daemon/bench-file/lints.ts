import type { Bench } from "../model/bench.ts";
import type { Finding } from "./problem.ts";

export function lintBench(_bench: Bench): Finding[] {
  return [];
}
