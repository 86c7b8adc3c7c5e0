import { spawn } from "node:child_process";
import { fileURLToPath } from "node:url";

/** Folder of the checkout. */
export const root = fileURLToPath(new URL("../..", import.meta.url)).replace(/\/$/, "");

/** One line for a person. To stderr, since stdout belongs to the program that runs afterwards. */
export const say = (line) => process.stderr.write(`beamsitter: ${line}\n`);

/** The checkout cannot be made ready; `remedy` says what to do about it. */
export class NotReady extends Error {
  constructor(message, remedy) {
    super(message);
    this.remedy = remedy;
  }
}

/** How often a long step tells that it is still at work. */
const still_ms = 10_000;

/**
 * Runs a program in the checkout and waits for it. Its stdout goes to stderr.
 * Resolves to its exit code; a signal that ended it counts as 1.
 */
export function runTool(what, command, args, env = process.env) {
  const begun = Date.now();
  const still = setInterval(() => {
    say(`still ${what}, ${Math.round((Date.now() - begun) / 1000)} s so far`);
  }, still_ms);
  return new Promise((resolve, reject) => {
    const child = spawn(command, args, { cwd: root, env, stdio: ["ignore", 2, 2] });
    child.once("error", (error) => {
      clearInterval(still);
      reject(
        new NotReady(
          `${command} could not be started: ${error.message}.`,
          `Install ${command}, or put it on the PATH, and run the same command again.`,
        ),
      );
    });
    child.once("close", (code) => {
      clearInterval(still);
      resolve(code ?? 1);
    });
  });
}
