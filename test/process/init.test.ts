import { type ChildProcess, spawn } from "node:child_process";
import { existsSync, readFileSync, writeFileSync } from "node:fs";
import { join } from "node:path";
import { afterEach, beforeEach, describe, expect, test } from "vitest";
import { CLI, Place, runCli } from "./daemon.ts";

let place: Place;
let file: string;
let typing: ChildProcess | null = null;
beforeEach(() => {
  place = new Place();
  file = join(place.folder, "bench.yaml");
});
afterEach(() => {
  typing?.kill("SIGKILL");
  place.remove();
});

const SHEET = ["--wavelength=808nm", "--threshold=0.4A", "--slope=1.05W/A", "--current=1.8A"];
const WHOLE = [...SHEET, "--absolute=2.2A", "--voltage=1.85V"];

/** Answers each question at a terminal with the next of these; what the terminal shows. */
function answer(answers: readonly string[]): Promise<string> {
  const child = spawn(
    "script",
    ["-qec", `'${process.execPath}' '${CLI}' init '${file}'`, "/dev/null"],
    {
      env: place.env,
    },
  );
  typing = child;
  const left = [...answers];
  return new Promise((resolve) => {
    let shown = "";
    let asked = 0;
    child.stdout.on("data", (bytes: Buffer) => {
      shown += bytes.toString();
      // Every question ends with a colon and the column at which the answer begins.
      const questions = shown.split(": \u001b[").length - 1;
      for (; asked < questions; asked++) child.stdin.write(`${left.shift() ?? ""}\r`);
    });
    child.on("close", (code) => resolve(`${shown}\nexit ${code}`));
  });
}

describe("init", () => {
  test("from options: a file that check passes, and what to do next", async () => {
    const ended = await runCli(place, "init", file, ...WHOLE, "--name=south");
    expect(ended).toMatchObject({ code: 0, stderr: "" });
    expect(ended.stdout).toContain(`beamsitter check ${file}`);
    const checked = await runCli(place, "check", file, "--json");
    expect(checked.code).toBe(0);
    const { ok, problems, ...rest } = JSON.parse(checked.stdout);
    expect(ok).toBe(true);
    expect(rest).toEqual({});
    const keys = ["level", "code", "path", "line", "column", "found", "wanted", "do"];
    expect(Object.keys(problems[0])).toEqual(keys);
  });

  test("its first line leads an editor to the schema", async () => {
    await runCli(place, "init", file, ...WHOLE);
    const path = /\$schema=(\S+)/.exec(readFileSync(file, "utf8"))?.[1] ?? "";
    expect(existsSync(join(place.folder, path))).toBe(true);
  });

  test("a file that is there stays, unless --force", async () => {
    writeFileSync(file, "mine");
    const kept = await runCli(place, "init", file, ...WHOLE);
    expect(kept.code).toBe(1);
    expect(kept.stderr).toContain("--force");
    expect(readFileSync(file, "utf8")).toBe("mine");
    expect((await runCli(place, "init", file, ...WHOLE, "--force")).code).toBe(0);
    expect(readFileSync(file, "utf8")).toContain("bench: my-bench");
  });

  test.each([
    ["what has no usual value is named", SHEET, 2, "--absolute"],
    ["a number without its unit", [...WHOLE, "--drift=0.3"], 2, "write the unit"],
    ["answers against each other", [...SHEET, "--absolute=1A"], 1, "above the absolute maximum"],
    ["a protection that is none", [...WHOLE, "--has=luck"], 2, "luck"],
    ["what check would refuse", [...WHOLE, "--rate=5/s"], 1, "too slow"],
  ])("without a terminal: %s; nothing is written", async (_what, options, code, words) => {
    const ended = await runCli(place, "init", file, ...options);
    expect(ended.code).toBe(code);
    expect(ended.stderr).toContain(words);
    expect(existsSync(file)).toBe(false);
  });

  test("at a terminal it asks, says what is wrong with an answer, and asks again", async () => {
    const board = ["south", "", "/dev/ttyACM3", "", "", ""];
    const diode = ["808 nm", "0.4", "0.4 A", "1.05 W/A", "", "1.8 A", "1.85 V", "2.2 A"];
    const rest = ["", "", "", "10 kohm", "", "", "16384 counts", "0.1 mW", "key, beam-stop"];
    const shown = await answer([...board, ...diode, ...rest]);
    expect(shown).toContain("exit 0");
    expect(shown).toContain("write the unit after the number");
    const text = readFileSync(file, "utf8");
    expect(text).toContain("bench: south");
    expect(text).toContain('path: "/dev/ttyACM3"');
    expect(text).toContain("full: 16384 counts");
    expect(text).toContain("beam-stop: yes");
    expect((await runCli(place, "check", file)).code).toBe(0);
  });

  test("Ctrl-D in the middle leaves everything as it was", async () => {
    const shown = await answer(["south", "\u0004"]);
    expect(shown).toContain("Nothing was written.");
    expect(existsSync(file)).toBe(false);
  });
});

test("check --explain tells a code and a row, and names the nearest of a slip", async () => {
  const row = await runCli(place, "check", "--explain", "case-over");
  expect(row).toMatchObject({ code: 0, stderr: "" });
  expect(row.stdout).toContain("common practice, no source");
  const slip = await runCli(place, "check", "--explain", "hunt");
  expect(slip.code).toBe(2);
  expect(slip.stderr).toContain("Did you mean hunts?");
});
