import fc from "fast-check";
import { describe, expect, test } from "vitest";
import { parse } from "yaml";
import {
  contradictions,
  type InitAnswers,
  PROTECTION_KEYS,
  type ProtectionKey,
} from "../../../daemon/bench-file/init/answers.ts";
import { writeBench, written } from "../../../daemon/bench-file/init/write.ts";
import { parseBench } from "../../../daemon/bench-file/parse.ts";
import { parseQuantity } from "../../../daemon/model/quantities.ts";
import { QUANTITY_KINDS } from "../../../daemon/model/quantity-units.ts";
import { photon_eV } from "../../../daemon/physics/photon.ts";

const SEED = 20261201;
const ALL = Object.fromEntries(PROTECTION_KEYS.map((key) => [key, true])) as Record<
  ProtectionKey,
  boolean
>;

/** A page-one data sheet of an 808 nm diode. */
const SHEET: InitAnswers = {
  name: "south",
  title: "808 nm, from its data sheet",
  connect: { kind: "serial", path: "/dev/ttyUSB0", baud: 115_200 },
  board: "any",
  rate_perS: 50,
  wavelength_nm: 808,
  threshold_mA: 400,
  slope_mWpermA: 1.05,
  at_degC: 25,
  operating_mA: 1800,
  operating_mV: 1850,
  absolute_mA: 2200,
  case_degC_min: 10,
  case_degC_max: 45,
  drift_nmPerK: 0.3,
  thermistor: { r25_ohm: 10_000, beta_K: 3950, fixed_ohm: 10_000, full_counts: 16_384 },
  photodiode_mW: 0.1,
  stream: null,
  protections: ALL,
};
const textOf = (answers: InitAnswers): string => writeBench(answers, "./bench.schema.json");

describe("a bench file from a data sheet", () => {
  const parsed = parseBench(textOf(SHEET));
  test("passes check without a hint", () => {
    expect(parsed.problems).toEqual([]);
    expect(parsed.ok).toBe(true);
  });
  test("means what was answered", () => {
    if (!parsed.ok) throw new Error("refused");
    const { diode, limits, derating, conversions } = parsed.bench;
    expect(diode).toMatchObject({ wavelength_nm: 808, threshold_mA: 400, absolute_mA: 2200 });
    expect(limits.current_mA).toBe(1800);
    expect(derating).toEqual([
      { case_degC: 25, current_mA: 1800 },
      { case_degC: 45, current_mA: 900 },
    ]);
    // 1.85 V at 1.8 A again, from the line that was written.
    expect((diode.v0_mV ?? 0) + (diode.rs_ohm ?? 0) * 1800).toBeCloseTo(1850, 1);
    expect(conversions.case?.law.kind).toBe("ntc");
  });
  test("begins with the line that tells an editor its schema, and says what was not asked", () => {
    const lines = textOf(SHEET).split("\n");
    expect(lines[0]).toBe("# yaml-language-server: $schema=./bench.schema.json");
    expect(lines.filter((line) => line.includes("usual")).length).toBeGreaterThan(3);
  });
  test("leaves room for a clamp where the operating point has none", () => {
    const tight = parseBench(textOf({ ...SHEET, absolute_mA: 1800 }));
    expect(tight.ok && tight.bench.limits.current_mA).toBe(1636);
  });
});

test("answers that contradict each other are told, not written", () => {
  expect(contradictions(SHEET)).toEqual([]);
  expect(contradictions({ ...SHEET, operating_mA: 400 })).toHaveLength(1);
  expect(contradictions({ ...SHEET, operating_mA: 2300 })).toHaveLength(1);
  expect(contradictions({ ...SHEET, case_degC_min: 45 })).toHaveLength(1);
});

test(`a written quantity reads back (seed ${SEED})`, () => {
  const value = fc.double({ min: 1e-3, max: 1e6, noNaN: true });
  fc.assert(
    fc.property(fc.constantFrom(...QUANTITY_KINDS), value, (kind, number) => {
      const parsed = parseQuantity(kind, written(kind, number));
      expect(parsed.ok && Math.abs(parsed.value / number - 1)).toBeLessThan(1e-5);
    }),
    { seed: SEED },
  );
});

const between = (min: number, max: number) => fc.double({ min, max, noNaN: true });
const yesNo = fc.boolean();

/** Whatever a person may answer within reason, each as a share of what it depends on. */
const reasonable = fc
  .record({
    name: fc.stringMatching(/^[a-z][a-z0-9-]{0,20}$/),
    title: fc
      .string({ minLength: 1, maxLength: 60 })
      .filter((text) => /^[ -~äöü°µ]*[!-~][ -~äöü°µ]*$/.test(text)),
    path: fc.constantFrom("/dev/ttyACM0", "/dev/serial/by-id/usb-x-if00", "COM3"),
    serial: fc.constantFrom("any", "A1B2", "007"),
    rate: fc.integer({ min: 20, max: 60 }),
    tcp: yesNo,
    wavelength: fc.integer({ min: 400, max: 1600 }),
    operating: between(50, 20_000),
    threshold: between(0.05, 0.5),
    slope: between(0.2, 0.8),
    voltage: fc.option(between(1.1, 1.6)),
    absolute: between(1, 1.5),
    caseMin: fc.integer({ min: 0, max: 24 }),
    caseMax: fc.integer({ min: 30, max: 70 }),
    drift: fc.option(between(0.05, 0.5)),
    sensor: fc.option(
      fc.record({ r25: between(1000, 100_000), beta: between(3000, 4500), share: between(0.5, 2) }),
    ),
    light: fc.option(between(0.001, 0.5)),
    has: fc.tuple(yesNo, yesNo, yesNo, yesNo, yesNo, yesNo),
  })
  .map((a): InitAnswers => {
    const photon_mV = 1000 * photon_eV(a.wavelength);
    return {
      name: a.name,
      title: a.title,
      connect: a.tcp
        ? { kind: "tcp", host: "192.168.1.20", port: 4160 }
        : { kind: "serial", path: a.path, baud: 115_200 },
      board: a.serial,
      rate_perS: a.rate,
      wavelength_nm: a.wavelength,
      threshold_mA: a.threshold * a.operating,
      slope_mWpermA: (a.slope * photon_mV) / 1000,
      at_degC: 25,
      operating_mA: a.operating,
      operating_mV: a.voltage === null ? null : a.voltage * photon_mV,
      absolute_mA: a.absolute * a.operating,
      case_degC_min: a.caseMin,
      case_degC_max: a.caseMax,
      drift_nmPerK: a.drift,
      thermistor:
        a.sensor === null
          ? null
          : {
              r25_ohm: a.sensor.r25,
              beta_K: a.sensor.beta,
              fixed_ohm: a.sensor.share * a.sensor.r25,
              full_counts: 16_384,
            },
      photodiode_mW: a.light,
      stream: null,
      protections: Object.fromEntries(
        PROTECTION_KEYS.map((key, n) => [key, a.has[n] ?? false]),
      ) as Record<ProtectionKey, boolean>,
    };
  });

test(`whatever is answered within reason passes check (seed ${SEED})`, () => {
  fc.assert(
    fc.property(reasonable, (answers) => {
      expect(contradictions(answers)).toEqual([]);
      const text = textOf(answers);
      const parsed = parseBench(text);
      expect(parsed.problems.filter(({ level }) => level === "error")).toEqual([]);
      expect(parsed.ok && parsed.bench.title).toBe(answers.title);
      expect(parse(text)).toMatchObject({ bench: answers.name });
    }),
    { seed: SEED, numRuns: 300 },
  );
});
