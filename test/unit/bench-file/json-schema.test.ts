import { readFileSync } from "node:fs";
import { Ajv } from "ajv";
import fc from "fast-check";
import { describe, expect, test } from "vitest";
import { parse } from "yaml";
import { quantityShape } from "../../../daemon/bench-file/field-shapes.ts";
import { benchJsonSchemaText } from "../../../daemon/bench-file/json-schema.ts";
import { parseQuantity } from "../../../daemon/model/quantities.ts";
import { KINDS, QUANTITY_KINDS } from "../../../daemon/model/quantity-units.ts";
import { BARE_DIODE, changed, NORTH } from "./files.ts";

const SEED = 20261201;
const published = readFileSync(
  new URL("../../../daemon/bench-file/bench.schema.json", import.meta.url),
  "utf8",
);
const schema = JSON.parse(published);
const validate = new Ajv({ strict: false, allErrors: true }).compile(schema);

/** Where a general validator finds fault with a bench file, as JSON pointers with their keyword. */
function faults(text: string): string[] {
  validate(parse(text));
  return (validate.errors ?? []).map((error) => `${error.instancePath} ${error.keyword}`);
}

interface Node {
  readonly type?: string | string[];
  readonly description?: string;
  readonly properties?: Readonly<Record<string, Node>>;
  readonly additionalProperties?: Node | false;
  readonly items?: Node;
}

/** Every key that the schema knows, with what stands under it. */
function* keysOf(node: Node, path: string): Generator<readonly [string, Node]> {
  for (const [key, below] of Object.entries(node.properties ?? {})) {
    yield [`${path}/${key}`, below];
    yield* keysOf(below, `${path}/${key}`);
  }
  if (node.items !== undefined) yield* keysOf(node.items, `${path}[]`);
  const rest = node.additionalProperties;
  if (typeof rest === "object") yield* keysOf(rest, `${path}/*`);
}

test("the published schema is up to date (made by test/programs/bench-schema.ts)", () => {
  expect(published).toBe(benchJsonSchemaText());
});

describe("a general validator", () => {
  test("finds nothing wrong with the bench files that ship", () => {
    expect(faults(NORTH)).toEqual([]);
    expect(faults(BARE_DIODE)).toEqual([]);
  });
  test.each([
    ["a number without its unit", "current: 1.9 A", "current: 1.9", "/limits/current type"],
    ["a unit of another kind", "at: 25 °C", "at: 25 K", "/diode/at pattern"],
    ["an unknown word", "light: continuous", "light: pulsed", "/light enum"],
    ["an unknown key", "light: continuous", "lihgt: continuous", " additionalProperties"],
    ["a missing key", "  slope: 1.05 W/A", "  # slope", "/diode required"],
    ["a word for a number", "depth: 6", "depth: six", "/crystal/depth type"],
    ["a value for a section", "limits:\n", "limits: 3\nother:\n", "/limits type"],
  ])("finds %s", (_name, from, to, fault) => {
    expect(faults(changed(NORTH, from, to))).toContain(fault);
  });
});

test("every key has a description to hover over, and those in use all are known", () => {
  const keys = [...keysOf(schema, "")];
  expect(keys.length).toBeGreaterThan(80);
  for (const [path, node] of keys) {
    expect(node.description ?? "", path).toMatch(/^[A-Z].{8,}\.$/s);
  }
});

test(`a quantity's pattern takes what parseQuantity takes, and nothing else (seed ${SEED})`, () => {
  const number = fc.oneof(
    fc.integer({ min: -999, max: 999 }).map(String),
    fc.constantFrom("1.8", ".5", "1,8", "1e3", "−4", "1.", "+2", "", "x", "1e", "1_000"),
  );
  const symbols = QUANTITY_KINDS.flatMap((kind) => KINDS[kind].units.map((unit) => unit.symbol));
  const unit = fc.constantFrom(...symbols, "", "amp", "ma", "k");
  const space = fc.constantFrom("", " ", "\u00a0", "  ");
  fc.assert(
    fc.property(fc.constantFrom(...QUANTITY_KINDS), number, space, unit, (kind, n, gap, symbol) => {
      const { pattern } = quantityShape(kind, { min: 0, max: 1 }, undefined);
      const text = `${n}${gap}${symbol}`;
      expect(new RegExp(String(pattern), "u").test(text), text).toBe(parseQuantity(kind, text).ok);
    }),
    { seed: SEED, numRuns: 2000 },
  );
});
