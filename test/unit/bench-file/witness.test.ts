import { describe, expect, test } from "vitest";
import { differences } from "../../../daemon/bench-file/describe.ts";
import { parseBench } from "../../../daemon/bench-file/parse.ts";
import { benchOf, NORTH } from "./files.ts";

const METER = `
witness:
  meter:
    address: tcp://192.168.1.30:5025
    query: MEAS:POW?
    unit: W
    period: 500 ms
    calibrated: 2026-03-01
    due: 2027-03-01
`;

describe("witness", () => {
  test("reads as the instrument it describes; its readings are kept in the held unit", () => {
    expect(benchOf(NORTH + METER).witnesses).toEqual([
      {
        name: "meter",
        address: { kind: "tcp", host: "192.168.1.30", port: 5025 },
        query: "MEAS:POW?",
        unit: "mW",
        perRead: 1000,
        period_ms: 500,
        calibrated: "2026-03-01",
        due: "2027-03-01",
      },
    ]);
  });
  test("on a serial port, with the usual line rate", () => {
    const text = METER.replace("tcp://192.168.1.30:5025", "serial:/dev/ttyUSB1");
    const [witness] = benchOf(NORTH + text).witnesses ?? [];
    expect(witness?.address).toEqual({ kind: "serial", path: "/dev/ttyUSB1", baud: 9600 });
  });
  test.each([
    ["an address of another form", "tcp://192.168.1.30:5025", "192.168.1.30", "text"],
    ["a command that asks nothing", "MEAS:POW?", "OUTP ON", "text"],
    ["a setting hidden before a question", "MEAS:POW?", '"SOUR:CURR 2;MEAS:CURR?"', "text"],
    ["a setting in the words of a question", "MEAS:POW?", "CURR 2?", "text"],
    ["two commands in one", "MEAS:POW?", '"OUTP:ON;FETC?"', "text"],
    ["a unit that is none", "unit: W", "unit: foot", "word"],
    ["a day that is none", "2026-03-01", "1.3.2026", "text"],
    ["due before it was calibrated", "due: 2027-03-01", "due: 2026-03-01", "date"],
    ["a name with capitals", "  meter:", "  Meter:", "shape"],
  ])("%s is refused at its place", (_what, from, to, code) => {
    const parsed = parseBench(NORTH + METER.replace(from, to));
    expect(parsed.ok).toBe(false);
    expect(parsed.problems[0]).toMatchObject({ level: "error", code });
    expect(parsed.problems[0]?.line).toBeGreaterThan(NORTH.split("\n").length - 1);
  });
  test("a changed one is told before the file is taken into use", () => {
    const changes = differences(benchOf(NORTH), benchOf(NORTH + METER));
    expect(changes).toHaveLength(1);
    expect(changes[0]).toContain("witness.meter is new: MEAS:POW? at 192.168.1.30:5025");
  });
});
