import { z } from "zod";
import { parseQuantity } from "../model/quantities.ts";
import { KINDS, type QuantityKind } from "../model/quantity-units.ts";
import type { WitnessSpec } from "../model/witness.ts";
import { line, oneOf, quantity, section } from "./fields.ts";
import type { Finding } from "./problem.ts";

/** Units that an instrument may answer in. */
const UNITS = ["W", "mW", "uW", "A", "mA", "uA", "V", "mV", "°C", "K", "nm"] as const;
const KINDS_READ: readonly QuantityKind[] = [
  "power",
  "current",
  "voltage",
  "temperature",
  "difference",
  "length",
];
const DAY = /^\d{4}-(0[1-9]|1[0-2])-(0[1-9]|[12]\d|3[01])$/;

const oneWitness = section("a map that describes one instrument", {
  address: line(
    "tcp://host:port, or serial:/dev/ttyUSB1",
    /^(tcp:\/\/[A-Za-z0-9.-]{1,200}:[1-9]\d{0,4}|serial:\S{1,200})$/,
  ),
  baud: quantity("baud", { min: 300, max: 4_000_000 }, 9600).describe(
    "Line rate of the instrument's serial port.",
  ),
  // One question and nothing else: no semicolon and no space, behind which a setting could travel.
  // An instrument may be the very supply that feeds the diode, and only a permit raises current.
  query: line("one question without a space or ;, such as MEAS:POW?", /^[!-:<-~]{1,99}\?$/),
  unit: oneOf("the unit that it answers in", UNITS, "W"),
  period: quantity("time", { min: 100, max: 3_600_000 }, 1000).describe("How often it is asked."),
  calibrated: line("the day of its calibration, 2026-03-01", DAY, ""),
  due: line("the day when its calibration is due again, 2027-03-01", DAY, ""),
});

/** Instruments beside the bench, by name. */
export const witnessSchema = z
  .record(z.string().regex(/^[a-z][a-z0-9-]{0,30}$/), oneWitness, {
    error: () => "a map of instruments, each under a short name",
  })
  .describe("Second instruments, recorded and compared, never feeding a permit.");

type WitnessFile = z.output<typeof witnessSchema>;

/** Instruments as the recorder asks them; what cannot be becomes a finding. */
export function witnessesOf(file: WitnessFile, findings: Finding[]): WitnessSpec[] {
  return Object.entries(file).map(([name, written]) => {
    const { unit, period, calibrated, due, query } = written;
    // Days written so are in order where their texts are.
    if (calibrated !== "" && due !== "" && due <= calibrated) {
      findings.push({
        level: "error",
        code: "date",
        path: ["witness", name, "due"],
        found: `${due}, not after its calibration on ${calibrated}`,
        wanted: "a day after the calibration",
        do: "look at the calibration's certificate",
      });
    }
    return {
      name,
      address: addressOf(written.address, written.baud),
      query,
      ...heldUnit(unit),
      period_ms: period,
      calibrated: calibrated === "" ? null : calibrated,
      due: due === "" ? null : due,
    };
  });
}

function addressOf(text: string, baud: number): WitnessSpec["address"] {
  const tcp = /^tcp:\/\/(.+):(\d+)$/.exec(text);
  if (tcp !== null) return { kind: "tcp", host: tcp[1] ?? "", port: Number(tcp[2]) };
  return { kind: "serial", path: text.replace(/^serial:/, ""), baud };
}

function heldUnit(unit: (typeof UNITS)[number]): { unit: string; perRead: number } {
  for (const kind of KINDS_READ) {
    const parsed = parseQuantity(kind, `1 ${unit}`);
    if (parsed.ok) return { unit: KINDS[kind].held, perRead: parsed.value };
  }
  return { unit, perRead: 1 };
}
