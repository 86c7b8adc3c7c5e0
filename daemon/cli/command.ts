import { Command } from "commander";

/**
 * A command with its examples. They stand in `--help`, and a test parses every one of them.
 * @param note a paragraph for `--help`, before the examples; empty for none
 */
export function commandOf(
  name: string,
  description: string,
  examples: readonly string[],
  note = "",
): Command {
  const lines = examples.map((example) => `  beamsitter ${example}`);
  const before = note === "" ? "" : `\n${note}\n`;
  return new Command(name)
    .description(description)
    .addHelpText("after", `${before}\nExamples:\n${lines.join("\n")}`);
}

/** Options of every command that speaks to a running daemon. */
export interface DaemonOptions {
  readonly on?: string;
  readonly json?: boolean;
}

/** A command that speaks to a running daemon. */
export const daemonCommandOf = (
  name: string,
  description: string,
  examples: readonly string[],
  note = "",
): Command =>
  commandOf(name, description, examples, note)
    .option("--on <name>", "which bench, where several run")
    .option("--json", "the answer as one JSON object");
