/**
 * Writes daemon/bench-file/bench.schema.json from the fields that read a bench file. Run it after
 * changing them: `node daemon/ready.mjs program test/programs/bench-schema.js`. A test finds a file
 * that is out of date.
 */
import { writeFileSync } from "node:fs";
import { join } from "node:path";
import { benchJsonSchemaText } from "../../daemon/bench-file/json-schema.ts";
import { packageRoot } from "../../daemon/paths.ts";

writeFileSync(join(packageRoot, "daemon/bench-file/bench.schema.json"), benchJsonSchemaText());
