import { describe, expect, test } from "vitest";
import { add, closingLine, countsOf, noCounts, runAndCount } from "../../all/counts.mjs";

describe("what a program of the suite counts for", () => {
  test("its closing line, when it has one", () => {
    expect(countsOf("noise\n3 passed, 0 failed, 1 skipped\n", 0)).toEqual({
      passed: 3,
      failed: 0,
      skipped: 1,
    });
  });

  test("its closing line, when it knows of no skipping", () => {
    expect(countsOf("2 passed, 1 failed\n", 1)).toEqual({ passed: 2, failed: 1, skipped: 0 });
  });

  test("one check, when it has none", () => {
    expect(countsOf("all well\n", 0)).toEqual({ passed: 1, failed: 0, skipped: 0 });
    expect(countsOf("bad\n", 2)).toEqual({ passed: 0, failed: 1, skipped: 0 });
  });

  test("a failure, when it ends badly in spite of its counts", () => {
    expect(countsOf("3 passed, 0 failed, 0 skipped", 1).failed).toBe(1);
  });

  test("counts add up to the line that ends everything", () => {
    const total = noCounts();
    add(total, { passed: 3, failed: 1, skipped: 0 });
    add(total, { passed: 2, failed: 0, skipped: 4 });
    expect(closingLine(total)).toBe("5 passed, 1 failed, 4 skipped");
  });
});

describe("running a program of the suite", () => {
  const node = (script, limit_ms) =>
    runAndCount("a test of the runner", process.execPath, ["-e", script], limit_ms);

  test("counts one that cannot be started as failed", async () => {
    const counts = await runAndCount("none", "no-such-program", [], 1000);
    expect(counts).toEqual({ passed: 0, failed: 1, skipped: 0 });
  });

  test("ends one that hangs, and counts it as failed", async () => {
    const counts = await node("setInterval(() => {}, 1000)", 200);
    expect(counts).toEqual({ passed: 0, failed: 1, skipped: 0 });
  });

  test("reads the counts it prints", async () => {
    const counts = await node('console.log("7 passed, 0 failed, 2 skipped")', 10_000);
    expect(counts).toEqual({ passed: 7, failed: 0, skipped: 2 });
  });
});
