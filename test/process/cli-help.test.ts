import type { Command } from "commander";
import { afterAll, describe, expect, test } from "vitest";
import { makeProgram } from "../../daemon/cli/program.ts";
import { EXIT, type Trouble } from "../../daemon/cli/say.ts";
import { Place, runCli } from "./daemon.ts";

/** The words of an example as a shell would hand them over; examples quote nothing. */
const argumentsOf = (example: string): string[] => example.trim().split(/\s+/).slice(1);

/** Everything a command prints as help, its examples among it. */
function helpOf(command: Command): string {
  let text = "";
  command.configureOutput({ writeOut: (piece) => (text += piece) });
  command.outputHelp();
  return text;
}

const examplesOf = (help: string): string[] =>
  help
    .slice(help.indexOf("Examples:"))
    .split("\n")
    .filter((line) => line.startsWith("  beamsitter "))
    .map((line) => (line.split(/ {3,}/)[0] === "" ? line : line.replace(/ {3,}\S.*$/, "")));

const COMMANDS = makeProgram().commands.map((command) => command.name());

/** Parses a command line without doing what it says; which command it was, and its options. */
async function parsed(line: string[]): Promise<{ name: string; options: Record<string, unknown> }> {
  const program = makeProgram();
  let reached = { name: "", options: {} };
  program.configureOutput({ writeErr: () => {} });
  for (const command of program.commands) {
    // A command's parts are that command's too.
    for (const part of [command, ...command.commands]) {
      part.configureOutput({ writeErr: () => {} });
      part.action(() => {
        reached = { name: command.name(), options: part.opts() };
      });
    }
  }
  await program.parseAsync(line, { from: "user" });
  return reached;
}

describe("help", () => {
  test.each(COMMANDS)("every example of %s parses, and is that command's", async (name) => {
    const command = makeProgram().commands.find((c) => c.name() === name);
    const parts = command === undefined ? [] : [command, ...command.commands];
    const examples = parts.flatMap((part) => examplesOf(helpOf(part)));
    expect(examples.length).toBeGreaterThan(0);
    for (const example of examples) {
      expect((await parsed(argumentsOf(example))).name, example).toBe(name);
    }
  });

  test("the examples of the whole parse too, and exit codes are told everywhere", async () => {
    const examples = examplesOf(helpOf(makeProgram()));
    expect(examples.length).toBeGreaterThan(3);
    for (const example of examples) {
      expect(COMMANDS).toContain((await parsed(argumentsOf(example))).name);
    }
    for (const command of makeProgram().commands) expect(helpOf(command)).toContain("Exit codes:");
  });

  test("an example that does not parse is caught", async () => {
    await expect(parsed(argumentsOf("beamsitter demo --seeed 7"))).rejects.toThrow("seeed");
    await expect(parsed(argumentsOf("beamsitter arm"))).rejects.toThrow("current");
  });

  test("every command that speaks to a daemon takes --on, and every one --json", () => {
    const longs = (c: Command): (string | null | undefined)[] => c.options.map((o) => o.long);
    for (const command of makeProgram().commands) {
      expect(longs(command), command.name()).toContain("--json");
      const speaks = ["open", "status", "arm", "set", "dark", "reset", "adopt", "export"];
      if (speaks.includes(command.name())) expect(longs(command)).toContain("--on");
    }
  });
});

describe("options", () => {
  test("with = or a space: the same", async () => {
    const spaced = await parsed(["demo", "--for", "8h", "--seed", "9"]);
    const joined = await parsed(["demo", "--for=8h", "--seed=9"]);
    expect(joined).toEqual(spaced);
    expect(spaced.options).toMatchObject({ for: "8h", seed: "9" });
  });

  test.each([
    [["demo", "--seed", "7", "--seed", "8"], "--seed"],
    [["run", "--port=1", "--stay-dark", "--port=2"], "--port"],
    [["status", "--json", "--json"], "--json"],
    [["arm", "1A", "--on", "a", "--on=b"], "--on"],
  ])("%j: a repeated option is refused", async (line, option) => {
    await expect(parsed(line)).rejects.toThrow(`${option} stands twice.`);
  });
});

/** What a command line is refused with, before it did anything; and what was written about it. */
async function refusal(line: string[]): Promise<{ error: unknown; written: string }> {
  const program = makeProgram();
  let written = "";
  for (const command of [program, ...program.commands]) {
    command.configureOutput({ writeErr: (piece) => (written += piece) });
  }
  const error = await program.parseAsync(line, { from: "user" }).then(
    () => null,
    (refused: unknown) => refused,
  );
  return { error, written };
}

describe("slips", () => {
  test.each([
    [["sttus"], "Did you mean status?"],
    [["demo", "--seeed", "7"], "Did you mean --seed?"],
    [["run", "--stay-drak"], "Did you mean --stay-dark?"],
  ])("%j is named", async (line, words) => {
    const { error, written } = await refusal(line);
    expect(error).not.toBeNull();
    expect(written).toContain(words);
  });

  test("a mistyped cause is named", async () => {
    const { error } = await refusal(["reset", "permit-expird"]);
    expect(error).toMatchObject({ exit: EXIT.usage });
    expect(String(error)).toContain("did you mean permit-expired?");
  });

  test.each([
    [["demo", "--seed", ""]],
    [["demo", "--seed", "-1"]],
    [["demo", "--seed", "1.5"]],
    [["demo", "--seed", "4294967296"]],
    [["demo", "--for", "8"]],
    [["demo", "--for", "0 s"]],
    [["demo", "--for", "-1 h"]],
    [["demo", "--for", "1000 h"]],
    [["listen", "/dev/null", "--baud", "fast"]],
    [["run", "--port", "abc"]],
    [["run", "--port=-1"]],
    [["run", "--port", "70000"]],
    [["run", "--port="]],
    [["arm", "1.2"]],
    [["set", "lots"]],
  ])("%j is nonsense and refused, with what is wanted", async (line) => {
    const { error } = await refusal(line);
    expect(error).toMatchObject({ exit: EXIT.usage });
    expect(String(error)).toContain("; wanted ");
    expect((error as Trouble).remedy).toContain("Nothing was changed.");
  });
});

describe("the built command line", () => {
  const place = new Place();
  afterAll(() => place.remove());

  test("--version is that of the package", async () => {
    const { code, stdout } = await runCli(place, "--version");
    expect(code).toBe(0);
    expect(stdout).toMatch(/^\d+\.\d+\.\d+\n$/);
  });

  test("a slip: exit code 2, words on stderr, nothing on stdout", async () => {
    const { code, stderr, stdout } = await runCli(place, "sttus");
    expect(code).toBe(2);
    expect(stderr).toContain("Did you mean status?");
    expect(stdout).toBe("");
  });

  test("a trouble is told in words, and with --json as one object that says the same", async () => {
    const { code, stderr, stdout } = await runCli(place, "arm", "1.2", "--json");
    expect(code).toBe(2);
    expect(stderr).toContain("Found 1.2; wanted a current with its unit");
    expect(JSON.parse(stdout)).toMatchObject({ ok: false, reason: "trouble", exit: 2 });
    const nobody = await runCli(place, "status", "--on", "south");
    expect(nobody.code).toBe(3);
    expect(nobody.stderr).toContain('No daemon runs for a bench named "south".');
  });
});
