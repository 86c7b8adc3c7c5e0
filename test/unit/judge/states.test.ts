import { describe, expect, test } from "vitest";
import { Rig } from "./rig.ts";

describe("first light", () => {
  test("arms, permits, emits what was asked", () => {
    const rig = new Rig().light(1500);
    expect(rig.stateName).toBe("emitting");
    expect(rig.trips()).toEqual([]);
    expect(rig.out.view.current_mA).toBe(1500);
    expect(rig.told.map((e) => e.kind)).toEqual(["connected", "armed", "emitting"]);
  });
});
