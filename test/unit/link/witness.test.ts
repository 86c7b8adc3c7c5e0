import { afterEach, beforeEach, describe, expect, test, vi } from "vitest";
import { Witness } from "../../../daemon/link/transports/witness.ts";
import type { WitnessSpec } from "../../../daemon/model/witness.ts";
import { ScpiServer } from "./scpi-server.ts";

const WAIT = { timeout: 15_000, interval: 5 };
let meter: ScpiServer;
let witness: Witness | null = null;

beforeEach(async () => {
  meter = await ScpiServer.start();
});
afterEach(async () => {
  witness?.stop();
  await meter.stop();
});

/** Begins to ask the meter; what came of it. */
function ask(): { readonly readings: number[]; readonly states: string[]; identity: string } {
  const told = { readings: [] as number[], states: [] as string[], identity: "" };
  const spec: WitnessSpec = {
    name: "meter",
    address: { kind: "tcp", host: "127.0.0.1", port: meter.port },
    query: "MEAS:POW?",
    unit: "mW",
    perRead: 1000,
    period_ms: 10,
    calibrated: null,
    due: null,
  };
  witness = new Witness(spec, {
    reading: (value, identity) => {
      told.readings.push(value);
      told.identity = identity;
    },
    state: (words) => told.states.push(words),
  });
  witness.start();
  return told;
}

describe("a witness over TCP", () => {
  test("is asked who it is once, then for readings, which come in the held unit", async () => {
    const told = ask();
    await vi.waitFor(() => expect(told.readings.length).toBeGreaterThan(2), WAIT);
    expect(told.readings[0]).toBeCloseTo(1830, 9);
    expect(told.identity).toBe("Made up,Meter,0,1.0");
    expect(meter.asked.slice(0, 3)).toEqual(["*IDN?", "MEAS:POW?", "MEAS:POW?"]);
    expect(told.states).toEqual([""]);
  });

  test.each([
    ["a word", "OVER", /no number/],
    ["an overload", "9.9E37", /overload/],
    ["nothing after the sign", "-", /no number/],
    ["a number with a word", "1.8 apples", /no number/],
  ])("%s is no reading, and told once", async (_what, answer, words) => {
    meter.answer = answer;
    const told = ask();
    await vi.waitFor(() => expect(meter.asked.length).toBeGreaterThan(4), WAIT);
    expect(told.readings).toEqual([]);
    expect(told.states).toHaveLength(1);
    expect(told.states[0]).toMatch(words);
  });

  test("several numbers in an answer: the first one counts", async () => {
    meter.answer = "2.5,1,0";
    const told = ask();
    await vi.waitFor(() => expect(told.readings.length).toBeGreaterThan(0), WAIT);
    expect(told.readings[0]).toBe(2500);
  });

  test("one that hangs up is told, found again, and asked who it is anew", async () => {
    const told = ask();
    await vi.waitFor(() => expect(told.readings.length).toBeGreaterThan(0), WAIT);
    meter.hangUp();
    await vi.waitFor(() => expect(told.states.length).toBeGreaterThanOrEqual(3), WAIT);
    expect(told.states[1]).not.toBe("");
    expect(told.states[2]).toBe("");
    expect(meter.asked.filter((line) => line === "*IDN?")).toHaveLength(2);
  });
});
