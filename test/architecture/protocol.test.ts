import { describe, expect, test } from "vitest";
import { CAUSES } from "../../daemon/model/cause.ts";
import { STATUS } from "../../daemon/model/sample.ts";
import { MESSAGES, VERBS } from "../../firmware-protocol/messages.ts";
import { pathsOf, readSource } from "./sources.ts";

const page = readSource("firmware-protocol/PROTOCOL.md").text;
const c = pathsOf(["firmware-protocol/c"], [".c", ".h"]).map((path) => readSource(path).text);
const core = c.join("\n");

interface Vector {
  readonly line: string;
  readonly verdict: string;
  readonly verb?: string;
}

const isVectors = (value: unknown): value is { readonly vectors: readonly Vector[] } =>
  typeof value === "object" && value !== null && "vectors" in value && Array.isArray(value.vectors);

/** Every golden line of one direction. */
function vectorsTo(side: string): readonly Vector[] {
  const { path, text } = readSource(`firmware-protocol/vectors/to-${side}.json`);
  const file: unknown = JSON.parse(text);
  if (!isVectors(file)) throw new Error(`${path} holds no list named vectors`);
  return file.vectors;
}

const verbsTo = (side: string): string[] => VERBS.filter((verb) => MESSAGES[verb].to === side);

/** Rows of the one table of the page whose head begins so, cells without their marks. */
function tableAfter(head: string): string[][] {
  const lines = page.split("\n");
  const start = lines.findIndex((line) => line.startsWith(head));
  expect(start, `PROTOCOL.md has a table that begins ${head}`).toBeGreaterThan(0);
  const rows: string[][] = [];
  for (const line of lines.slice(start + 2)) {
    if (!line.startsWith("|")) break;
    rows.push(line.split("|").map((cell) => cell.replaceAll("`", "").trim()));
  }
  return rows.map((row) => row.slice(1, -1));
}

/** Capabilities that the core knows and refuses. */
const ABSENT = new Set(["cool", "shutter"]);

/** By which of its own facts the core sets each status bit, in the order of its table. */
const STATUS_FACTS: Readonly<Record<keyof typeof STATUS, RegExp>> = {
  emitting: /->drive > 0/,
  armed: /^armed$/,
  tripped: /CORE_TRIPPED/,
  key: /->key$/,
  loop: /->loop$/,
  fan: /->fan$/,
  limited: /->limited$/,
  injected: /->injection/,
  hand: /->hand/,
  lockout: /reason != /,
  delay: /->delay/,
  anchor: /anchor_seq == /,
  indicator: /->indicator$/,
  shutter: /^0$/,
  curve: /->curve\[/,
};

describe("every message", () => {
  const [toController = "", toHost = ""] = tableAfter("| host to controller |")[0] ?? [];

  test("of the page is in the codec's table, and the other way round", () => {
    expect(toController.split(" ").sort()).toEqual(verbsTo("controller").sort());
    expect(toHost.split(" ").sort()).toEqual(verbsTo("host").sort());
  });

  test.each(VERBS)("%s has at least three valid and three broken vectors", (verb) => {
    const own = vectorsTo(MESSAGES[verb].to).filter((vector) => vector.verb === verb);
    const valid = own.filter(({ verdict }) => verdict === "ok");
    expect(valid.length).toBeGreaterThanOrEqual(3);
    expect(own.length - valid.length).toBeGreaterThanOrEqual(3);
  });

  test.each(verbsTo("controller"))("%s has a handler in the controller core", (verb) => {
    const entry = new RegExp(`\\{"${verb}", "[a-zA-Z]*", (core_obey_\\w+)\\}`).exec(core);
    const handler = entry?.[1] ?? "none";
    const expected = ABSENT.has(verb) ? "core_obey_absent" : `core_obey_${verb}`;
    expect(handler).toBe(expected);
    expect(new RegExp(`^void ${handler}\\([^;]*\\) \\{`, "m").test(core)).toBe(true);
  });

  // `say` carries words for a person; a board may do without.
  const written = verbsTo("host").filter((verb) => verb !== "say");
  test.each(written)("%s is written by the controller core", (verb) => {
    expect(core.includes(`"${verb}"`)).toBe(true);
  });
});

test("there are at least 150 golden lines", () => {
  expect(vectorsTo("controller").length + vectorsTo("host").length).toBeGreaterThanOrEqual(150);
});

describe("tables that stand in several places", () => {
  test("causes: the page and the model", () => {
    const written = tableAfter("| code | id | meaning |");
    expect(written).toEqual(CAUSES.map(({ code, id, words }) => [String(code), id, words]));
  });

  test("causes: the board's own and the core", () => {
    const inCore = [...core.matchAll(/CORE_CAUSE_[A-Z_]+ = (\d+)/g)].map((match) => match[1]);
    const board = CAUSES.filter(({ by, code }) => by === "board" || code === 0);
    expect(inCore.map(Number)).toEqual(board.map(({ code }) => code));
  });

  test("status bits: the page and the model", () => {
    const written = tableAfter("| bit | name |").filter(([, name]) => name !== "–");
    const inModel = Object.entries(STATUS).map(([name, mask]) => [`${Math.log2(mask)}`, name]);
    expect(written.map((row) => row.slice(0, 2))).toEqual(inModel);
  });

  test("status bits: the model and the core", () => {
    const table = /facts\[(\d+)\] = \{([^}]*)\}/.exec(core);
    const facts = (table?.[2] ?? "").split(",").map((fact) => fact.trim());
    const wanted = Object.entries(STATUS).sort(([, a], [, b]) => a - b);
    expect(facts).toHaveLength(wanted.length);
    wanted.forEach(([name, mask], bit) => {
      expect(mask).toBe(1 << bit);
      expect(facts[bit]).toMatch(STATUS_FACTS[name as keyof typeof STATUS]);
    });
  });
});
