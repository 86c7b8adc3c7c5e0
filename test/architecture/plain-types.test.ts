import { describe, expect, test } from "vitest";
import { lineAt, parse, pathsOf, ROOMS, readSource, type Source, walk } from "./sources.ts";

/** Places that switch a checker off altogether, or for one line without saying why. */
function unexplained({ path, text }: Source): string[] {
  return text.split("\n").flatMap((line, index) => {
    const place = `${path}:${index + 1}`;
    // The words are put together here, so that this file does not find itself.
    if (new RegExp(`@ts-${"ignore"}|@ts-${"nocheck"}`).test(line)) {
      return [`${place} switches the compiler off`];
    }
    const match = new RegExp(`(@ts-${"expect-error"}|biome-${"ignore"}[^:]*:)(.*)`).exec(line);
    if (match === null) return [];
    return (match[2] ?? "").replace(/\*\/.*/, "").trim().length >= 10
      ? []
      : [`${place} does not say why`];
  });
}

function anyTypes(source: Source): string[] {
  const found: string[] = [];
  walk(parse(source), (node) => {
    if (node.type === "TSAnyKeyword") {
      found.push(`${source.path}:${lineAt(source.text, node.start)} says any; say unknown`);
    }
  });
  return found;
}

describe("types say what they mean", () => {
  test("nothing is of type any", () => {
    expect(pathsOf(ROOMS, [".ts", ".tsx"]).map(readSource).flatMap(anyTypes)).toEqual([]);
  });

  test("nothing switches a checker off without saying why", () => {
    const files = pathsOf(ROOMS, [".ts", ".tsx", ".mjs", ".css"]).map(readSource);
    expect(files.flatMap(unexplained)).toEqual([]);
  });

  test("planted ones are caught", () => {
    expect(anyTypes({ path: "a.ts", text: "const f = (x: any[]) => x;" })).toHaveLength(1);
    for (const comment of [`@ts-${"ignore"} because`, `biome-${"ignore"} lint/x: no`]) {
      expect(unexplained({ path: "a.ts", text: `// ${comment}` })).toHaveLength(1);
    }
  });
});
