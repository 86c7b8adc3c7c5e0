import { readdirSync } from "node:fs";
import { expect, test } from "vitest";
import { packageRoot } from "../../daemon/paths.ts";

const WANTED = ["daemon", "firmware-protocol", "dashboards", "test"];
const DOCUMENTS = ["README.md", "DEVELOPERS.md", "LICENSE"];
const CONFIGURATION = [
  "package.json",
  "package-lock.json",
  "tsconfig.json",
  "biome.json",
  "knip.json",
  "vitest.config.ts",
];
/** Made by installing, building and testing; ignored by git. */
const MADE = ["node_modules", "dist", "coverage"];

test("the top level holds the four rooms, the documents and the configuration, nothing else", () => {
  const found = readdirSync(packageRoot).filter(
    (name) => !name.startsWith(".") && !MADE.includes(name),
  );
  expect(found.sort()).toEqual([...WANTED, ...DOCUMENTS, ...CONFIGURATION].sort());
});
