import { spawnSync } from "node:child_process";
import { join } from "node:path";
import { describe, expect, test } from "vitest";
import { packageRoot } from "../../daemon/paths.ts";

const PROGRAM = join(packageRoot, "dist", "test", "programs", "judge-heap.js");
/** Megabytes of young generation: far more than the program can fill, so nothing is collected. */
const YOUNG = ["--min-semi-space-size=64", "--max-semi-space-size=64"];

interface Figures {
  readonly samples: number;
  readonly bytes: number;
  readonly nsPerSample: number;
  readonly digest: number;
  readonly state: number;
}

function figures(): Figures {
  const run = spawnSync(process.execPath, [...YOUNG, PROGRAM], { encoding: "utf8" });
  if (run.status !== 0) throw new Error(run.stderr);
  return JSON.parse(run.stdout) as Figures;
}

describe("the judge over 100,000 samples", () => {
  test("allocates under 64 KiB, and gives the same digest in another process", () => {
    const one = figures();
    const two = figures();
    expect(one.samples).toBe(100_000);
    expect(one.state, "still emitting: the whole step was measured").toBe(3);
    expect(Math.min(one.bytes, two.bytes)).toBeLessThan(65_536);
    expect(two.digest).toBe(one.digest);
  });
});
