import fc from "fast-check";
import { describe, expect, test } from "vitest";
import {
  advance,
  caseRate_KperS,
  fosterOf,
  loopGain,
  settle,
  sinkRate_KperS,
} from "../../../daemon/physics/thermal.ts";

const seed = 20261201;
const net = { caseToSink_KperW: 1.5, sinkToRoom_KperW: 4.5, case_JperK: 8, sink_JperK: 60 };

describe("two nodes", () => {
  test("where it settles, nothing moves", () => {
    const state = { case_degC: 0, sink_degC: 0 };
    settle(net, 1.86, 22, state);
    expect(state.sink_degC).toBeCloseTo(22 + 1.86 * 4.5, 12);
    expect(state.case_degC).toBeCloseTo(22 + 1.86 * 6, 12);
    expect(caseRate_KperS(net, state, 1.86)).toBeCloseTo(0, 12);
    expect(sinkRate_KperS(net, state, 22)).toBeCloseTo(0, 12);
  });
  test("a day is not too long a step", () => {
    const state = { case_degC: 90, sink_degC: -10 };
    advance(net, state, 1.86, 22, 86_400);
    expect(state.case_degC).toBeCloseTo(22 + 1.86 * 6, 9);
  });
  test(`the exact step agrees with small steps of the rates (seed ${seed})`, () => {
    const celsius = fc.double({ min: 0, max: 60, noNaN: true });
    fc.assert(
      fc.property(celsius, celsius, fc.double({ min: 0, max: 5, noNaN: true }), (c, s, heat_W) => {
        const exact = { case_degC: c, sink_degC: s };
        advance(net, exact, heat_W, 22, 2);
        const small = { case_degC: c, sink_degC: s };
        for (let n = 0; n < 2000; n += 1) {
          const up = caseRate_KperS(net, small, heat_W);
          const down = sinkRate_KperS(net, small, 22);
          small.case_degC += up * 0.001;
          small.sink_degC += down * 0.001;
        }
        // Euler's error at 1 ms against a fast constant of about 10 s.
        expect(Math.abs(exact.case_degC - small.case_degC)).toBeLessThan(0.005);
        expect(Math.abs(exact.sink_degC - small.sink_degC)).toBeLessThan(0.005);
      }),
      { seed, numRuns: 30 },
    );
  });
  test("its step response ends at the sum of the two resistances", () => {
    const { fast_KperW, slow_KperW, slow_s } = fosterOf(net);
    expect(fast_KperW + slow_KperW).toBeCloseTo(6, 12);
    expect(slow_s).toBeGreaterThan(60 * 4.5);
  });
});

test("loop gain: 50 mA/K on 6 K/W and 1.2 V of heat a current is 0.36", () => {
  expect(loopGain(-50, 6, 1200)).toBeCloseTo(0.36, 12);
});
