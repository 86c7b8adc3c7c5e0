import { mkdtempSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { parseArgs } from "node:util";
import { killing } from "./killing.ts";

/**
 * `npm run kills -- --times 200 --seed 1 --json`: kills a recording process again and again and
 * tells what was lost. Ends with code 1 where more was lost than may be.
 */
const { values } = parseArgs({
  options: {
    times: { type: "string", default: "200" },
    seed: { type: "string", default: "1" },
    json: { type: "boolean", default: false },
  },
});
const whole = (name: string, text: string): number => {
  const value = Number(text);
  if (Number.isInteger(value) && value >= 1) return value;
  process.stderr.write(`--${name} is "${text}"; a whole number from 1 is wanted.\n`);
  process.exit(2);
};
const times = whole("times", values.times);
const seed = whole("seed", values.seed);

const root = mkdtempSync(join(tmpdir(), "beamsitter-kills-"));
try {
  const found = await killing(join(root, "data"), times, seed, (kills) => {
    if (process.stderr.isTTY) process.stderr.write(`\r${kills} of ${times} kills`);
  });
  if (process.stderr.isTTY) process.stderr.write("\r\u001b[2K");
  if (values.json) process.stdout.write(`${JSON.stringify(found)}\n`);
  else {
    process.stdout.write(
      `${found.kills} kills (seed ${seed}): at most ${found.lostSamplesMaxSeconds.toFixed(2)} s of samples lost, ${found.lostEvents} events lost, ${found.rearmed} starts without the mark of light, ${found.unreadable} times not readable.\n`,
    );
  }
  const isFine =
    found.lostSamplesMaxSeconds <= 1 && found.lostEvents + found.rearmed + found.unreadable === 0;
  process.exitCode = isFine ? 0 : 1;
} finally {
  rmSync(root, { recursive: true, force: true });
}
