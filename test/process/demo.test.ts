import { readFileSync } from "node:fs";
import { join } from "node:path";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { NightSummary, Sessions } from "../../daemon/cli/answers.ts";
import { Place, runCli } from "./daemon.ts";

/** Long enough for the evening's cap of bench north to begin. */
const NIGHT = ["--for", "20min", "--as-fast-as-possible"];
const place = new Place();
const folder = join(place.folder, "night");

async function night(...args: string[]): Promise<NightSummary> {
  const { code, stdout, stderr } = await runCli(place, "demo", "--json", ...NIGHT, ...args);
  expect(stderr).toBe("");
  expect(code).toBe(0);
  return NightSummary.parse(JSON.parse(stdout));
}

let kept: NightSummary;
beforeAll(async () => {
  kept = await night("--seed", "7", "--data", folder);
});
afterAll(() => place.remove());

describe("demo", () => {
  test("the same seed gives the same night, with or without a record; another seed another", async () => {
    const again = await night("--seed=7");
    expect({ ...again, wallSeconds: 0 }).toEqual({ ...kept, wallSeconds: 0 });
    const other = await night("--seed", "8");
    expect(other.seed).toBe(8);
    expect({ ...other, seed: 7, wallSeconds: 0 }).not.toEqual({ ...kept, wallSeconds: 0 });
    expect(kept).toMatchObject({ simulatedSeconds: 1200, trips: [] });
    expect(kept.samples).toBeGreaterThan(1200 * 20 * 0.99);
  });

  test("a folder that holds a record is not mixed with a simulated night", async () => {
    const { code, stderr } = await runCli(place, "demo", ...NIGHT, "--data", folder);
    expect(code).toBe(4);
    expect(stderr).toContain("a simulated night is not mixed with it");
  });

  test("the kept record is written as CSV with every sample", async () => {
    const sessions = await runCli(place, "export", "--data", folder, "--json");
    const rows = Sessions.parse(JSON.parse(sessions.stdout));
    expect(rows.length).toBe(kept.sessions);
    expect(rows.reduce((sum, s) => sum + s.samples, 0)).toBe(kept.samples);
    const file = join(place.folder, "night.csv");
    const { code } = await runCli(place, "export", file, "--data", folder);
    expect(code).toBe(0);
    const lines = readFileSync(file, "utf8").trimEnd().split("\r\n");
    expect(lines).toHaveLength(kept.samples + 1);
    const head = (lines[0] ?? "").split(",");
    expect(head).toContain("case [degC]");
    expect(head).toContain("judge.ceiling [mA]");
    const at = head.indexOf("case [degC]");
    const highest = Math.max(...lines.slice(1).map((line) => Number(line.split(",")[at])));
    expect(highest).toBeCloseTo(kept.highestCaseC, 1);
  });

  test("nonsense to export is refused in words", async () => {
    for (const [args, words] of [
      [["--session", "99"], "There is no session 99."],
      [["--from", "yesterday"], "yesterday is no moment."],
      [["--channels", "current,curent"], "curent"],
    ] as const) {
      const { code, stderr } = await runCli(place, "export", "--data", folder, ...args);
      expect(code).not.toBe(0);
      expect(stderr).toContain(words);
    }
    const { code, stderr } = await runCli(place, "export", "--on", "south");
    expect(code).toBe(4);
    expect(stderr).toContain('There is no record of a bench named "south"');
  });
});
