import { describe, expect, test } from "vitest";
import { impurities } from "./purity.ts";
import { PURE_ROOMS, roomOf } from "./rooms.ts";
import { typescriptOf } from "./sources.ts";

const inPlanted = (text: string): string[] => impurities({ path: "daemon/judge/planted.ts", text });

describe("pure rooms", () => {
  test.each(PURE_ROOMS.map((room) => room.path))("%s has no clock, chance or I/O", (path) => {
    const own = typescriptOf(path).filter((source) => roomOf(source.path)?.path === path);
    expect(own.flatMap(impurities)).toEqual([]);
  });

  test.each([
    "const t = Date.now();",
    "const t = new Date();",
    "const t = performance.now();",
    "setTimeout(f, 1);",
    "const f = () => Math.random();",
    'const f = Math["random"];',
    "console.log(1);",
    "const home = process.env.HOME;",
    "const later = { setTimeout };",
  ])("a planted one is caught: %s", (text) => {
    expect(inPlanted(text)).toHaveLength(1);
  });

  test("properties and keys of such names are no use of them", () => {
    expect(inPlanted("const a = x.process + y.console; const o = { Date: 1 };")).toEqual([]);
    expect(inPlanted("interface P { process: number; performance(): void }")).toEqual([]);
  });
});
