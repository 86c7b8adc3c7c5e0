import { describe, expect, test } from "vitest";
import { boardCeiling_mA } from "../../../daemon/bench-file/curve.ts";
import { crystalOutput_mW, floor_mA } from "../../../daemon/physics/crystal.ts";
import { heat_mW } from "../../../daemon/physics/diode.ts";
import { benchOf, NORTH } from "./files.ts";

/** The story the built-in bench is there to tell: lit all night, capped on a warm evening. */
const north = benchOf(NORTH);
const { diode, crystal, cooling, hazards, limits } = north;
if (crystal === null || cooling === null) throw new Error("north has a crystal and a sink");
const asked_mA = 1800;

/** Settles current and case together; each round moves closer only where the loop gain is under 1. */
function settleAt(room_degC: number) {
  if (cooling === null) throw new Error("north has a sink");
  const toRoom = cooling.caseToSink_KperW + cooling.sinkToRoom_KperW;
  let current_mA = asked_mA;
  let case_degC = room_degC;
  let moved_mA = 0;
  for (let round = 0; round < 60; round += 1) {
    case_degC = room_degC + (toRoom * heat_mW(diode, current_mA, case_degC)) / 1000;
    const next_mA = Math.min(asked_mA, boardCeiling_mA(north, case_degC));
    moved_mA = Math.abs(next_mA - current_mA);
    current_mA = next_mA;
  }
  return { current_mA, case_degC, moved_mA };
}

describe("north at 1.80 A", () => {
  test("in a room of 20 °C runs uncapped, well above its floor", () => {
    const { current_mA, case_degC } = settleAt(20);
    expect(current_mA).toBe(asked_mA);
    expect(boardCeiling_mA(north, case_degC)).toBeGreaterThan(asked_mA * 1.02);
    expect(floor_mA(diode, crystal, case_degC, limits.current_mA)).toBeLessThan(0.5 * asked_mA);
  });
  test.each([26, 28, 30])("in a room of %f °C is capped, settles, and still lases", (room_degC) => {
    const { current_mA, case_degC, moved_mA } = settleAt(room_degC);
    expect(current_mA).toBeLessThan(asked_mA);
    expect(moved_mA).toBeLessThan(0.001);
    expect(crystalOutput_mW(diode, crystal, current_mA, case_degC)).toBeGreaterThan(50);
    expect(case_degC).toBeLessThan(hazards["case-over"].warn ?? 0);
  });
});
