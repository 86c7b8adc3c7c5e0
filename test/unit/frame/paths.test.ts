import { existsSync } from "node:fs";
import { fileURLToPath } from "node:url";
import { describe, expect, test } from "vitest";
import {
  assetFile,
  builtFile,
  distRoot,
  packageRoot,
  pagesRoot,
  workerFile,
} from "../../../daemon/paths.ts";

describe("where things lie", () => {
  test("the package root holds package.json", () => {
    expect(existsSync(`${packageRoot}/package.json`)).toBe(true);
  });

  test("assets come from the tree that runs, here the sources", () => {
    expect(fileURLToPath(assetFile("tsconfig.json"))).toBe(`${packageRoot}/tsconfig.json`);
  });

  test("workers and programs come from dist, also in tests", () => {
    expect(fileURLToPath(workerFile("record"))).toBe(`${distRoot}/daemon/record/worker.js`);
    expect(fileURLToPath(builtFile("daemon/cli/main.js"))).toBe(`${distRoot}/daemon/cli/main.js`);
    expect(pagesRoot.startsWith(distRoot)).toBe(true);
  });
});
