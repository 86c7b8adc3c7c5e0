import { spawn } from "node:child_process";
import { root } from "../../daemon/ready/say.mjs";

export const noCounts = () => ({ passed: 0, failed: 0, skipped: 0 });

export function add(to, counts) {
  to.passed += counts.passed;
  to.failed += counts.failed;
  to.skipped += counts.skipped;
}

export const closingLine = ({ passed, failed, skipped }) =>
  `${passed} passed, ${failed} failed, ${skipped} skipped`;

const CLOSING = /^(\d+) passed, (\d+) failed(?:, (\d+) skipped)?$/;

/**
 * What a finished program counts for. One that closes with a line of counts counts for that; any
 * other is one check. A bad exit that its counts do not show is one failure more.
 */
export function countsOf(output, exitCode) {
  const last = output.trimEnd().split("\n").at(-1) ?? "";
  const match = CLOSING.exec(last.trim());
  if (match === null) {
    return exitCode === 0 ? { passed: 1, failed: 0, skipped: 0 } : { ...noCounts(), failed: 1 };
  }
  const [passed, failed, skipped] = match.slice(1).map((n) => Number(n ?? 0));
  return { passed, failed: failed === 0 && exitCode !== 0 ? 1 : failed, skipped };
}

/** Enough of the end of a program's output to hold its closing line. */
const TAIL_CHARACTERS = 4096;

/**
 * Runs one program, showing what it prints, and counts it. One that outlasts `limit_ms` is ended
 * with everything it started, and counts as failed: a hung suite must not hang the whole.
 */
export function runAndCount(what, command, args, limit_ms) {
  return new Promise((resolve) => {
    console.log(`${what}: ${command} ${args.join(" ")}`);
    const child = spawn(command, args, {
      cwd: root,
      stdio: ["ignore", "pipe", "inherit"],
      detached: true,
    });
    let tail = "";
    const end = () => process.kill(-child.pid, "SIGKILL");
    const timer = setTimeout(() => {
      console.log(`${what}: still running after ${limit_ms / 1000} s; ended`);
      end();
    }, limit_ms);
    process.once("SIGINT", end);
    child.stdout.on("data", (bytes) => {
      process.stdout.write(bytes);
      tail = (tail + bytes.toString("utf8")).slice(-TAIL_CHARACTERS);
    });
    const settle = (counts) => {
      clearTimeout(timer);
      process.off("SIGINT", end);
      resolve(counts);
    };
    child.once("error", (error) => {
      console.log(`${what}: ${command} could not be started: ${error.message}`);
      settle({ ...noCounts(), failed: 1 });
    });
    child.once("close", (code) => settle(countsOf(tail, code ?? 1)));
  });
}
