import { existsSync } from "node:fs";
import { describe, expect, test } from "vitest";
import { packageRoot } from "../../daemon/paths.ts";
import { pathsOf, ROOMS, readSource } from "./sources.ts";

/** Where a path that the map names may begin. */
const BEGINNINGS = ["", "daemon/", "firmware-protocol/"];
const PATH = /^[\w./-]+(\.(ts|tsx|mjs|c|h|md|json|html)|\/)$/;
/** A name that stands in the sources: more than one word, so that no plain word counts. */
const NAME = /^(?=.*[a-z_].*[A-Z_])[A-Za-z_]\w+$/;

const code = pathsOf(ROOMS, [".ts", ".tsx", ".mjs", ".c", ".h"])
  .map((path) => readSource(path).text)
  .join("\n");

/** What stands in code marks in a page, whole blocks left out. */
function marked(text: string): string[] {
  const lines = text.split("\n").filter((line) => !line.startsWith("    "));
  return [...lines.join("\n").matchAll(/`([^`\n]+)`/g)].map((match) => match[1] ?? "");
}

/** Paths and names that a page speaks of and that are not there. */
function missing(text: string): string[] {
  return marked(text).filter((term) => {
    if (PATH.test(term)) return !BEGINNINGS.some((at) => existsSync(`${packageRoot}/${at}${term}`));
    return NAME.test(term) && !new RegExp(`\\b${term}`).test(code);
  });
}

describe("the map", () => {
  test("names only files and functions that are there", () => {
    const { text } = readSource("DEVELOPERS.md");
    expect(marked(text).length).toBeGreaterThan(50);
    expect(missing(text)).toEqual([]);
  });

  test("a planted file and a planted function that are not there are caught", () => {
    const name = ["encode", "Nothing"].join("");
    expect(missing(`see \`judge/nowhere.ts\` and \`${name}\`, not \`step\``)).toEqual([
      "judge/nowhere.ts",
      name,
    ]);
  });
});
