import { makeCurve } from "../bench-file/curve.ts";
import { parseBench } from "../bench-file/parse.ts";
import { compilePlan, type Plan } from "../judge/plan.ts";
import type { Manifest } from "../model/manifest.ts";

/** The plan by which a bench file's text judges a controller, or null where they do not go together. */
export function planOf(benchText: string, manifest: Manifest): Plan | null {
  const parsed = parseBench(benchText);
  if (!parsed.ok) return null;
  const curve = makeCurve(parsed.bench, manifest);
  if ("problems" in curve) return null;
  const compiled = compilePlan(parsed.bench, manifest, curve);
  return compiled.ok ? compiled.plan : null;
}
