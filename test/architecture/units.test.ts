import { describe, expect, test } from "vitest";
import { lineAt, parse, pathsOf, ROOMS, readSource, type Source, walk } from "./sources.ts";

/** Units as names carry them, in exact SI case: mA is not MA, and K is not k. */
const UNITS = [
  ..."A mA uA V mV uV W mW uW s ms us ns min h Hz kHz MHz K mK degC mdegC".split(" "),
  ..."ohm kohm nm pm mm um perS perH KperW KperS mAperS mWpermA nmPerK".split(" "),
];
/** Follow a unit, or stand where none is. */
const QUALIFIERS = new Set(["min", "max", "MIN", "MAX"]);
const exact = new Set(UNITS);
const rightCase = new Map(UNITS.map((unit) => [unit.toLowerCase(), unit]));

/** What is wrong with a name's unit, in words; null where nothing is. */
function misspelt(name: string): string | null {
  for (const part of name.split("_").slice(1)) {
    const unit = rightCase.get(part.toLowerCase());
    if (unit === undefined || exact.has(part) || QUALIFIERS.has(part)) continue;
    return `${name} ends in ${part}; the unit is written ${unit}, also in constants`;
  }
  return null;
}

function misspeltIn(source: Source): string[] {
  const found = new Map<string, string>();
  walk(parse(source), (node) => {
    if (node.type !== "Identifier" || typeof node.name !== "string") return;
    const what = misspelt(node.name);
    const place = `${source.path}:${lineAt(source.text, node.start)}`;
    if (what !== null && !found.has(node.name)) found.set(node.name, `${place} ${what}`);
  });
  return [...found.values()];
}

describe("units in names", () => {
  test("are written in exact SI case", () => {
    const sources = pathsOf(ROOMS, [".ts", ".tsx", ".mjs"]).map(readSource);
    expect(sources.flatMap(misspeltIn)).toEqual([]);
  });

  test.each(["current_MA", "ceiling_ma_max", "case_degc", "POLL_MS", "rise_k", "slope_MWPERMA"])(
    "%s is caught",
    (name) => {
      expect(misspeltIn({ path: "a.ts", text: `const ${name} = 1;` })).toHaveLength(1);
    },
  );

  test.each(["current_mA", "case_degC_max", "poll_ms", "LINE_BYTES_MAX", "rjc_KperW", "TERM_MIN"])(
    "%s passes",
    (name) => {
      expect(misspeltIn({ path: "a.ts", text: `const ${name} = 1;` })).toEqual([]);
    },
  );
});
