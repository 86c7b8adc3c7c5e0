import { spawnSync } from "node:child_process";
import { packageRoot } from "../daemon/paths.ts";

/**
 * Tests of processes run dist/, so it is brought up to date first. Type errors are printed and do
 * not stop the tests: the code is emitted all the same, and `npm test` fails on them by itself.
 */
export default function buildFirst(): void {
  spawnSync(process.execPath, ["daemon/ready.mjs", "build"], {
    cwd: packageRoot,
    stdio: "inherit",
  });
}
