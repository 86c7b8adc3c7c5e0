/**
 * Writes firmware-protocol/vectors/: golden lines with hand-written verdicts, closed with the
 * codec's own checksum. Run it after changing the cases:
 * `node daemon/ready.mjs program test/vectors/make.js`. A test finds files that are out of date.
 */
import { writeFileSync } from "node:fs";
import { join } from "node:path";
import { packageRoot } from "../../daemon/paths.ts";
import { vectorFiles } from "./files.ts";

for (const [name, text] of vectorFiles()) {
  writeFileSync(join(packageRoot, "firmware-protocol", "vectors", name), text);
}
