import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterAll, describe, expect, test } from "vitest";
import { packageRoot } from "../../daemon/paths.ts";
import { callsIn, forbiddenSymbols, recursive, undefinedSymbols } from "./core-object.ts";
import { pathsOf, readSource } from "./sources.ts";

const temporary = mkdtempSync(join(tmpdir(), "beamsitter-core-"));
afterAll(() => rmSync(temporary, { recursive: true }));

function folder(name: string): string {
  const path = join(temporary, name);
  mkdirSync(path);
  return path;
}

/** The core itself; what lies deeper below c/ tests it. */
const core = pathsOf(["firmware-protocol/c"], [".c"])
  .filter((path) => /^firmware-protocol\/c\/[^/]+\.c$/.test(path))
  .map((path) => join(packageRoot, path));

function planted(name: string, text: string): { files: string[]; into: string } {
  const into = folder(name);
  writeFileSync(join(into, "planted.c"), text);
  return { files: ["planted.c"], into };
}

describe("the controller core, compiled", () => {
  test("has sources", () => {
    expect(core.length).toBeGreaterThan(0);
  });

  test("wants nothing from outside but integer arithmetic, memcpy and memset", () => {
    expect(forbiddenSymbols(undefinedSymbols(core, folder("avr")))).toEqual([]);
  });

  test("never calls itself", () => {
    // The table of verbs is the one place where the core calls itself through a pointer.
    const parser = readSource("firmware-protocol/c/parse.c").text;
    const to = [...parser.matchAll(/, (core_obey_\w+)\}/g)].map((match) => match[1] ?? "");
    expect(to.length).toBeGreaterThan(10);
    const calls = callsIn(core, folder("calls"), { from: "core_obey_order", to });
    expect(calls.size).toBeGreaterThan(50);
    expect(recursive(calls)).toEqual([]);
  });

  test("planted floating point and heap are caught", () => {
    const { files, into } = planted(
      "float",
      `void *malloc(unsigned n);
       float half(float x) { return x / 2.5f; }
       long whole(long a, long b) { return a / b; }
       void *some(void) { return malloc(9); }`,
    );
    expect(forbiddenSymbols(undefinedSymbols(files, into))).toEqual(["__divsf3", "malloc"]);
  });

  test("planted recursion over two functions is caught", () => {
    const { files, into } = planted(
      "recursion",
      `static int odd(int n);
       int even(int n) { return n == 0 ? 1 : odd(n - 1); }
       static int odd(int n) { return n == 0 ? 0 : even(n - 1); }
       int plain(int n) { return even(n); }`,
    );
    const found = recursive(callsIn(files, into));
    expect(found.map((name) => name.replace(/^.*:/, "")).sort()).toEqual(["even", "odd"]);
  });
});
