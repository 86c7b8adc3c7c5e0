import { Failed } from "./answers.ts";
import { makeProgram } from "./program.ts";
import { codeOf, EXIT, jsonLine, reasonOf, Trouble, terminalColumns, wrapped } from "./say.ts";

/** What commander throws after it has told what was asked for. */
const TOLD = new Set(["commander.help", "commander.helpDisplayed", "commander.version"]);

// Whoever read our output has gone (`| head`): there is nobody left to tell, and that is no error.
process.stdout.on("error", (error) => {
  if (codeOf(error) !== "EPIPE") process.stderr.write(`Output stopped: ${reasonOf(error)}\n`);
});

try {
  await makeProgram().parseAsync(process.argv);
} catch (error) {
  process.exitCode = report(error);
}

/** Prints what went wrong and what to do; returns the exit code. */
function report(error: unknown): number {
  if (error instanceof Trouble) {
    for (const line of [error.message, error.remedy]) {
      if (line !== "") process.stderr.write(`${wrapped(line, terminalColumns(), "")}\n`);
    }
    if (process.argv.includes("--json")) {
      const { message: words, remedy, exit } = error;
      const failed = { ok: false, reason: "trouble", words, do: remedy, exit } as const;
      process.stdout.write(`${jsonLine(Failed, failed)}\n`);
    }
    return error.exit;
  }
  // commander has already written its own sentence; help and version are no errors.
  const code = codeOf(error);
  if (code.startsWith("commander.")) {
    return TOLD.has(code) ? EXIT.done : EXIT.usage;
  }
  throw error;
}
