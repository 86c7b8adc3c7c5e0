import fc from "fast-check";
import { describe, expect, test } from "vitest";
import {
  formatQuantity,
  parseQuantity,
  type QuantityKind,
} from "../../../daemon/model/quantities.ts";
import { KINDS, QUANTITY_KINDS } from "../../../daemon/model/quantity-units.ts";

const seed = 20261201;

describe("reading", () => {
  test.each<[QuantityKind, string, number]>([
    ["current", "1.8 A", 1800],
    ["current", "2.3A", 2300],
    ["current", "1800 mA", 1800],
    ["current", "−3 mA", -3],
    ["current", "5 µA", 0.005],
    ["temperature", "45 °C", 45],
    ["temperature", "45 degC", 45],
    ["temperature", "-12.5 °C", -12.5],
    ["difference", "2 K", 2],
    ["time", "10 min", 600_000],
    ["time", "1.5 h", 5_400_000],
    ["time", "300 ms", 300],
    ["slew", "200 mA/s", 200],
    ["slew", "0.2 A/s", 200],
    ["slope", "1.05 W/A", 1.05],
    ["slope", "1050 mW/A", 1.05],
    ["resistance", "10 kohm", 10_000],
    ["resistance", "10 kΩ", 10_000],
    ["ratio", "5 %", 0.05],
    ["rate", "50 /s", 50],
    ["rate", "50 Hz", 50],
    ["power", "1.5e3 mW", 1500],
    ["voltage", "1.85\u00a0V", 1850],
    ["baud", "115200 baud", 115_200],
  ])("%s: %s is %f", (kind, text, value) => {
    expect(parseQuantity(kind, text)).toEqual({ ok: true, value });
  });
});

describe("refusing, and saying what to write", () => {
  test.each<[QuantityKind, string, RegExp]>([
    ["current", "1.8", /unit after the number: mA, A/],
    ["current", "1800 MA", /M of MA means mega; write mA/],
    ["current", "1,8 A", /point, not a comma/],
    ["current", "5 V", /V is the unit of a voltage/],
    ["current", "2 amps", /write A/],
    ["current", "A", /begin with the number/],
    ["current", "1.8 A 2", /no unit known/],
    ["current", "", /write 1\.8 A/],
    ["current", "1e999 A", /smaller number/],
    ["temperature", "45 K", /K is a difference of temperatures/],
    ["temperature", "45 C", /write °C/],
    ["difference", "2 °C", /differences? .*of temperatures in K/],
    ["time", "5 Ms", /mega; write ms/],
    ["time", "5 sec", /write s$/],
    ["resistance", "10 k", /write kohm/],
    ["ratio", "0.05", /unit after the number: %/],
    ["power", "0x10 mW", /no unit known/],
    ["power", "NaN mW", /begin with the number/],
    ["power", "Infinity", /begin with the number/],
  ])("%s: %j", (kind, text, advice) => {
    const parsed = parseQuantity(kind, text);
    expect(parsed.ok).toBe(false);
    if (!parsed.ok) {
      expect(parsed.do).toMatch(advice);
      expect(parsed.wanted).toContain(KINDS[kind].example);
    }
  });
});

describe("writing", () => {
  test.each<[QuantityKind, number, number | undefined, string]>([
    ["current", 1800, undefined, "1.80 A"],
    ["current", 1794.3, 1, "1.794 A"],
    ["current", 5, 1, "5 mA"],
    ["current", -0.2, 1, "0 mA"],
    ["current", -25, 1, "−25 mA"],
    ["temperature", -3.04, undefined, "−3.0 °C"],
    ["temperature", 41, 1, "41 °C"],
    ["time", 500, undefined, "500 ms"],
    ["time", 1500, undefined, "1.5 s"],
    ["time", 90_000, undefined, "90 s"],
    ["time", 600_000, undefined, "10 min"],
    ["time", 28_800_000, undefined, "8 h"],
    ["ratio", 0.05, undefined, "5 %"],
    ["ratio", 0.9876, 0.001, "98.8 %"],
    ["power", 1470, undefined, "1.47 W"],
    ["power", 282.4, undefined, "282 mW"],
    ["power", Number.NaN, undefined, "not known"],
    ["current", Number.POSITIVE_INFINITY, undefined, "not known"],
  ])("%s %f at %s is %s", (kind, value, resolution, words) => {
    expect(formatQuantity(kind, value, resolution)).toBe(
      words.replace(/ (?=\S+$)/, "\u00a0").replace("not\u00a0known", "not known"),
    );
  });
});

describe(`properties (seed ${seed})`, () => {
  const kinds = fc.constantFrom(...QUANTITY_KINDS);

  test("every example in the table can be read", () => {
    for (const kind of QUANTITY_KINDS) {
      expect(parseQuantity(kind, KINDS[kind].example)).toMatchObject({ ok: true });
    }
  });
  test("what is written reads back within half a step", () => {
    const values = fc.double({ min: -1e5, max: 1e5, noNaN: true });
    fc.assert(
      fc.property(kinds, values, (kind, value) => {
        const step = KINDS[kind].resolution;
        const parsed = parseQuantity(kind, formatQuantity(kind, value, step));
        expect(parsed.ok).toBe(true);
        // Times above two minutes are written in whole minutes or hours.
        const slack = kind === "time" ? Math.abs(value) : 0;
        if (parsed.ok)
          expect(Math.abs(parsed.value - value)).toBeLessThanOrEqual(step / 2 + slack + 1e-6);
      }),
      { seed },
    );
  });
  test("whatever is typed, nothing is thrown", () => {
    fc.assert(
      fc.property(kinds, fc.string({ unit: "binary" }), (kind, text) => {
        const parsed = parseQuantity(kind, text);
        if (parsed.ok) expect(Number.isFinite(parsed.value)).toBe(true);
        else expect(parsed.do).not.toBe("");
      }),
      { seed, numRuns: 500 },
    );
  });
  test("a bare number is never taken", () => {
    fc.assert(
      fc.property(kinds, fc.double({ noNaN: true, noDefaultInfinity: true }), (kind, value) => {
        expect(parseQuantity(kind, String(value)).ok).toBe(false);
      }),
      { seed },
    );
  });
});
