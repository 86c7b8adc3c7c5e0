import { existsSync } from "node:fs";
import { describe, expect, test } from "vitest";
import { packageRoot } from "../../daemon/paths.ts";
import { pathsOf, ROOMS, readSource, type Source } from "./sources.ts";

/** Written in pieces, so that this file does not find itself. */
const ELSEWHERE = new RegExp(
  [
    "/wo" + "rk/",
    "\\bDES" + "IGN\\b",
    "\\bHAZ" + "ARDS\\.md",
    "\\bMET" + "HODS\\b",
    "FIELD-" + "NOTES",
  ].join("|"),
);

/** Mentions of pages and folders that a clone of this repository does not have. */
function mentions({ path, text }: Source): string[] {
  return text
    .split("\n")
    .flatMap((line, index) =>
      ELSEWHERE.test(line) ? [`${path}:${index + 1} ${line.trim()}`] : [],
    );
}

const TEXT = [
  ".ts",
  ".tsx",
  ".mjs",
  ".c",
  ".h",
  ".md",
  ".json",
  ".yaml",
  ".css",
  ".html",
  "Makefile",
];

describe("the repository stands by itself", () => {
  test("no file leans on a page or folder that only its makers had", () => {
    const documents = ["README.md", "DEVELOPERS.md", "package.json", "package-lock.json"];
    const there = documents.filter((name) => existsSync(`${packageRoot}/${name}`));
    const files = [...pathsOf(ROOMS, TEXT), ...there].map(readSource);
    expect(files.flatMap(mentions)).toEqual([]);
  });

  test("a planted mention is caught", () => {
    expect(mentions({ path: "a.ts", text: `// see ${"/wo" + "rk"}/notes` })).toHaveLength(1);
  });
});

/** Folders of test/ whose tests run, and the endings that their project of vitest.config.ts takes. */
const SUITES =
  /^test\/(unit|published|architecture)\/.+\.test\.(ts|tsx|mjs)$|^test\/(process|hardware|browser)\/.+\.test\.ts$/;

test("every test file belongs to a suite that runs", () => {
  const tests = pathsOf(["test"], [""]).filter((path) => /\.(test|spec)\.\w+$/.test(path));
  expect(tests.filter((path) => !SUITES.test(path))).toEqual([]);
  expect(tests.length).toBeGreaterThan(10);
});
