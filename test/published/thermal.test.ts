import { readFileSync } from "node:fs";
import { describe, expect, test } from "vitest";
import type { CoolingPart } from "../../daemon/model/bench.ts";
import { advance, fosterOf, stepFall_K, stepRise_K } from "../../daemon/physics/thermal.ts";

/**
 * Two-node heat against data/thermal.json: closed forms of linear RC networks, computed; the ladder
 * equivalent there was checked against an adaptive solution of the differential equation.
 */
interface Data {
  foster: {
    R_K_per_W: [number, number];
    tau_s: [number, number];
    P_W: number;
    step_up: { t_s: number; dT_K: number }[];
    step_off_after_equilibrium: { t_s: number; dT_K: number }[];
  };
  cauer_equivalent: {
    C1_J_per_K: number;
    R1_K_per_W: number;
    C2_J_per_K: number;
    R2_K_per_W: number;
  };
}
const file = new URL("./data/thermal.json", import.meta.url);
const { foster, cauer_equivalent: ladder }: Data = JSON.parse(readFileSync(file, "utf8"));
const net: CoolingPart = {
  caseToSink_KperW: ladder.R1_K_per_W,
  sinkToRoom_KperW: ladder.R2_K_per_W,
  case_JperK: ladder.C1_J_per_K,
  sink_JperK: ladder.C2_J_per_K,
};

test("the ladder has the two resistances and time constants of its step response", () => {
  const got = fosterOf(net);
  expect(got.fast_KperW).toBeCloseTo(foster.R_K_per_W[0], 8);
  expect(got.slow_KperW).toBeCloseTo(foster.R_K_per_W[1], 8);
  expect(got.fast_s).toBeCloseTo(foster.tau_s[0], 8);
  expect(got.slow_s).toBeCloseTo(foster.tau_s[1], 8);
});

describe("a step of heat from rest", () => {
  test.each(foster.step_up)("after $t_s s it is $dT_K K warmer", ({ t_s, dT_K }) => {
    expect(stepRise_K(fosterOf(net), foster.P_W, t_s)).toBeCloseTo(dT_K, 8);
    const state = { case_degC: 20, sink_degC: 20 };
    advance(net, state, foster.P_W, 20, t_s);
    expect(state.case_degC - 20).toBeCloseTo(dT_K, 8);
  });
  test("in a hundred uneven steps it is the same as in one", () => {
    const state = { case_degC: 20, sink_degC: 20 };
    let left_s = 60;
    for (let n = 0; n < 100; n += 1) {
      const by_s = left_s / (n < 99 ? 7 : 1);
      advance(net, state, foster.P_W, 20, by_s);
      left_s -= by_s;
    }
    // 12.8368343426 K after 60 s.
    expect(state.case_degC - 20).toBeCloseTo(12.8368343426, 8);
  });
});

describe("heat off after it has settled", () => {
  test.each(foster.step_off_after_equilibrium)("after $t_s s $dT_K K are left", ({ t_s, dT_K }) => {
    expect(stepFall_K(fosterOf(net), foster.P_W, t_s)).toBeCloseTo(dT_K, 8);
  });
});
