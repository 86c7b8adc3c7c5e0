import { describe, expect, test } from "vitest";
import {
  FILE_LINES_MAX,
  FUNCTION_LINES_MAX,
  longFunctions,
  longFunctionsInC,
  tooLong,
  WORKER_LINES_MAX,
} from "./sizes.ts";
import { pathsOf, ROOMS, readSource, typescriptOf } from "./sources.ts";

const code = pathsOf(ROOMS, [".ts", ".tsx", ".mjs", ".c", ".h", ".css", ".html"]).map(readSource);
const c = code.filter(({ path }) => /\.[ch]$/.test(path));

describe("sizes", () => {
  test(`no file has more than ${FILE_LINES_MAX} lines; commands and worker entries far fewer`, () => {
    expect(code.map(tooLong).filter((found) => found !== null)).toEqual([]);
  });

  test(`no function has more than ${FUNCTION_LINES_MAX} lines`, () => {
    // Test files are left out: `describe` makes one function of a whole page.
    const sources = typescriptOf(...ROOMS).filter(({ path }) => !/\.test\.tsx?$/.test(path));
    expect(sources.flatMap(longFunctions)).toEqual([]);
    expect(c.flatMap(longFunctionsInC)).toEqual([]);
  });

  test("no file is named after nothing", () => {
    const vague = /(^|[/.-])(utils?|helpers?|common|misc)([/.-]|$)/i;
    expect(pathsOf(ROOMS, [""]).filter((path) => vague.test(path))).toEqual([]);
  });

  test("planted ones are caught", () => {
    const path = "daemon/record/worker.ts";
    expect(tooLong({ path, text: "f();\n".repeat(WORKER_LINES_MAX + 1) })).toContain("16 lines");
    const body = "  g();\n".repeat(FUNCTION_LINES_MAX);
    const long = `export const f = () => {\n${body}};\n`;
    expect(longFunctions({ path, text: long })).toEqual([expect.stringContaining("f has 62")]);
    const inC = `static void f(void)\n{\n${body}}\n`;
    expect(longFunctionsInC({ path: "a.c", text: inC })).toHaveLength(1);
  });
});
