import { describe, expect, test } from "vitest";
import { nameOf, parse, type Source, typescriptOf, walk } from "./sources.ts";

/** Places that name a function other than where it is defined: calls, and anything that could call. */
function usesOf(name: string, sources: readonly Source[]): { calls: string[]; others: string[] } {
  const calls: string[] = [];
  const others: string[] = [];
  for (const source of sources) {
    walk(parse(source), (node, parent, key) => {
      if (node.type !== "Identifier" || node.name !== name || parent === null) return;
      const defines = key === "id" || (parent.type === "ImportSpecifier" && key !== "local");
      const imports = parent.type === "ImportSpecifier";
      if (defines || imports) return;
      const called = parent.type === "CallExpression" && nameOf(parent.callee) === name;
      (called && key === "callee" ? calls : others).push(source.path);
    });
  }
  return { calls, others };
}

const all = typescriptOf("daemon", "firmware-protocol", "dashboards");

describe("one path to current", () => {
  test.each(["encodePermit", "encodeArm"])("%s has exactly one caller", (name) => {
    expect(usesOf(name, all)).toEqual({ calls: ["daemon/link/session.ts"], others: [] });
  });

  test("a second caller, or a copy of the function under another name, is seen", () => {
    const planted: Source[] = [
      { path: "a.ts", text: 'import { encodePermit } from "./b.ts"; encodePermit(1);' },
      { path: "c.ts", text: "const raise = encodePermit; const o = { encodePermit };" },
    ];
    const { calls, others } = usesOf("encodePermit", planted);
    expect(calls).toEqual(["a.ts"]);
    expect(others.length).toBeGreaterThanOrEqual(2);
  });

  test("no other file of the daemon writes a permit or arm line by hand", () => {
    const byHand = typescriptOf("daemon", "dashboards").filter(({ text }) =>
      /["'`]>(permit|arm)\b/.test(text),
    );
    expect(byHand.map(({ path }) => path)).toEqual([]);
  });
});
