import { describe, expect, test } from "vitest";
import { COMPUTED, importsOf } from "./imports.ts";
import { violation } from "./rooms.ts";
import { pathsOf, readSource, type Source, typescriptOf } from "./sources.ts";

const violations = (sources: readonly Source[]): string[] =>
  sources.flatMap((source) => importsOf(source).map(violation)).filter((found) => found !== null);

describe("imports between rooms", () => {
  test("follow the table", () => {
    expect(violations(typescriptOf("daemon", "firmware-protocol", "dashboards"))).toEqual([]);
  });

  test("what runs before anything is installed needs Node alone", () => {
    const early = pathsOf(["daemon", "test"], [".mjs"]).filter((path) => !/\.test\./.test(path));
    const others = early
      .flatMap((path) => importsOf(readSource(path)))
      .filter(({ to }) => !to.startsWith("node:") && !to.endsWith(".mjs"));
    // The one computed import is the hand-over to the program that was just built.
    expect(others.map(({ from, to }) => [from, to])).toEqual([["daemon/ready.mjs", COMPUTED]]);
  });

  // Sources that exist only here, so that a checker which sees nothing is caught.
  const planted: readonly (readonly [string, string, string])[] = [
    ["daemon/judge/a.ts", 'import { readFileSync } from "node:fs";', "node:fs"],
    ["daemon/judge/a.ts", 'import type { X } from "../record/store.ts";', "daemon/record/store.ts"],
    ["daemon/link/a.ts", 'export * from "./transports/serial.ts";', "transports/serial.ts"],
    ["daemon/model/a.ts", 'const q = await import("zod");', "zod"],
    ["daemon/physics/a.ts", "const q = await import(name);", "(computed)"],
    ["daemon/desk/a.ts", 'import { Store } from "../record/store.ts";', "daemon/record/store.ts"],
    ["daemon/control/a.ts", 'type T = import("../cli/main.ts").T;', "daemon/cli/main.ts"],
    ["dashboards/a.tsx", 'import { mono } from "../daemon/model/times.ts";', "model/times.ts"],
    ["daemon/loose.ts", 'import "zod";', "belongs to no room"],
  ];
  test.each(planted)("a planted one in %s is caught: %s", (path, text, named) => {
    expect(violations([{ path, text }])).toEqual([expect.stringContaining(named)]);
  });

  test("those of the table pass", () => {
    const allowed: Source[] = [
      { path: "dashboards/a.ts", text: 'import type { Mono_ms } from "../daemon/model/times.ts";' },
      { path: "daemon/desk/a.ts", text: 'import { ask } from "../control/client.ts";' },
      { path: "daemon/link/transports/a.ts", text: 'import { x } from "../session.ts";' },
      { path: "daemon/record/a.ts", text: 'import fs from "node:fs/promises";' },
    ];
    expect(violations(allowed)).toEqual([]);
  });
});
