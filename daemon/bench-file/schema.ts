import { z } from "zod";
import {
  line,
  oneOf,
  plainNumber,
  quantity,
  quantityOrNone,
  section,
  wholeNumber,
  yesNo,
} from "./fields.ts";
import { conversionSchema } from "./schema-channels.ts";
import { hazardsSchema } from "./schema-hazards.ts";
import { cutOffSchema, streamSchema } from "./schema-stream.ts";
import { witnessSchema } from "./schema-witness.ts";

/**
 * The shape of a bench file: its keys, their kinds and the widest values that make sense. What
 * depends on more than one value is in lints. Bounds are wide on purpose: they catch a wrong unit or
 * a slipped point, not a rare bench.
 */
const current = (max_mA = 100_000) => quantity("current", { min: 1, max: max_mA });
const caseTemperature = () => quantity("temperature", { min: -60, max: 200 });

const connectSchema = section("a map that says how the board is reached", {
  kind: oneOf("how the board is reached", ["serial", "tcp", "built-in"]),
  path: line("the port's path, such as /dev/ttyACM0", /^\S{1,200}$/, ""),
  baud: quantity("baud", { min: 300, max: 4_000_000 }, 115_200),
  host: line("a host name or address", /^[A-Za-z0-9.:-]{1,200}$/, ""),
  port: wholeNumber("the TCP port", { min: 1, max: 65_535 }, 0),
  seed: wholeNumber("the seed of the built-in bench", { min: 0, max: 4_294_967_295 }, 1),
});

const controllerSchema = section("a map that describes the board", {
  connect: connectSchema,
  board: line("the board's serial number, or any", /^(any|[A-Z0-9-]{1,12})$/, "any"),
  rate: quantity("rate", { min: 1, max: 2000 }, 50).describe(
    "Samples a second that the board sends; every one is judged.",
  ),
  term: quantity("time", { min: 150, max: 10_000 }, 500).describe(
    "How long light may go on after the last judged sample.",
  ),
  stream: streamSchema.optional(),
  "cut-off": cutOffSchema.optional(),
});

const diodeSchema = section("a map that describes the diode", {
  wavelength: quantity("length", { min: 200, max: 12_000 }).describe(
    "Wavelength with the junction at the temperature `at`.",
  ),
  threshold: current().describe("Current below which there is no laser light."),
  slope: quantity("slope", { min: 0.01, max: 10 }).describe("Light per current above threshold."),
  at: quantity("temperature", { min: -60, max: 200 }, 25).describe(
    "Temperature at which threshold and slope hold.",
  ),
  "threshold-t0": quantity("difference", { min: 10, max: 1000 }).describe(
    "Threshold grows by exp((T - at) / t0).",
  ),
  "slope-t1": quantity("difference", { min: 10, max: 5000 }).describe(
    "Slope shrinks by exp(-(T - at) / t1).",
  ),
  voltage: quantity("voltage", { min: 100, max: 20_000 })
    .describe("Forward voltage, its straight line drawn back to zero current.")
    .optional(),
  resistance: quantity("resistance", { min: 0, max: 100 })
    .describe("Slope of the forward voltage against current.")
    .optional(),
  absolute: current().describe("The data sheet's absolute maximum; nothing may be set above it."),
  "junction-to-case": quantity("thermal", { min: 0.01, max: 1000 })
    .describe("Thermal resistance from junction to case.")
    .optional(),
  "junction-max": quantity("temperature", { min: 0, max: 250 })
    .describe("Highest temperature of the junction.")
    .optional(),
});

const crystalSchema = section("a map that describes the crystal", {
  wavelength: quantity("length", { min: 200, max: 12_000 }).describe("Wavelength of the light."),
  threshold: quantity("power", { min: 0.1, max: 1_000_000 }).describe(
    "Absorbed pump light at which the crystal begins to lase.",
  ),
  slope: quantity("ratio", { min: 0.001, max: 1 }).describe(
    "Output per absorbed pump light above threshold.",
  ),
  line: quantity("length", { min: 200, max: 12_000 }).describe(
    "Centre of the crystal's absorption line.",
  ),
  "line-width": quantity("length", { min: 0.01, max: 200 }).describe(
    "Full width of the line at half its height.",
  ),
  depth: plainNumber("peak absorption times length", { min: 0.01, max: 100 }),
  "pump-drift": quantity("drift", { min: 0, max: 5 }, 0.3).describe(
    "How far the pump's wavelength moves with its junction.",
  ),
});

const coolingSchema = section("a map that describes the cooling", {
  "case-to-sink": quantity("thermal", { min: 0.01, max: 1000 }).describe(
    "Thermal resistance from case to heat sink.",
  ),
  "sink-to-room": quantity("thermal", { min: 0.01, max: 1000 }).describe(
    "Thermal resistance from heat sink to room.",
  ),
  "case-heat": quantity("heat", { min: 0.001, max: 100_000 }).describe(
    "Heat capacity of the case and what is bolted to it.",
  ),
  "sink-heat": quantity("heat", { min: 0.001, max: 1_000_000 }).describe(
    "Heat capacity of the heat sink.",
  ),
});

const limitsSchema = section("a map of limits", {
  current: current().describe("Never more current than this, however cool the case is."),
  "slew-up": quantity("slew", { min: 1, max: 100_000 }, 200).describe(
    "How fast the current may rise; a falling limit acts at once.",
  ),
  "dark-time": quantity("time", { min: 1000, max: 3_600_000 }, 600_000).describe(
    "This long at zero current, then back to standby.",
  ),
  recover: quantity("difference", { min: 0.1, max: 50 }, 1).describe(
    "A cap is lifted only after the case has been this much cooler.",
  ),
  "recover-after": quantity("time", { min: 1000, max: 3_600_000 }, 60_000).describe(
    "For this long.",
  ),
});

const deratingSchema = z
  .array(
    section("a point: a map of case and current", {
      case: caseTemperature().describe("Case temperature of this point."),
      current: quantity("current", { min: 0, max: 100_000 }).describe(
        "Most current at that temperature.",
      ),
    }),
    { error: () => "a list of points, each with case and current" },
  )
  .min(2)
  .max(16)
  .describe(
    "Most current by case temperature: straight lines between points, none beyond the last.",
  );

const protectionsSchema = section("a map of yes and no", {
  key: yesNo("a key switch breaks the supply of the output stage", false),
  "interlock-loop": yesNo("an interlock loop breaks the supply of the output stage", false),
  "emission-warning": yesNo("a lamp or buzzer warns of emission", false),
  "beam-stop": yesNo("a shutter or stop closes the beam", false),
  "manual-reset": yesNo("after an interlock somebody must reset by hand", false),
  "toggled-enable": yesNo("the output stage needs a toggled enable line", false),
});

const HOUR_ms = 3_600_000;
const CENTURY_ms = 100 * 365 * 24 * HOUR_ms;

const influxSchema = section("a map that says which server keeps the record a second time", {
  url: line(
    "an address such as http://127.0.0.1:8086, without user and password",
    /^https?:\/\/[^\s@/?#]{1,200}(\/[^\s@?#]{0,200})?$/,
  ),
  database: line(
    "a name: a-z, A-Z, 0-9, _ and -, beginning with a letter",
    /^[A-Za-z][A-Za-z0-9_-]{0,62}$/,
    "beamsitter",
  ),
  server: oneOf("what answers there", ["influxdb", "victoria-metrics"], "influxdb"),
  keep: quantityOrNone("time", { min: HOUR_ms, max: CENTURY_ms }, null).describe(
    "How long the server is asked to keep what it gets.",
  ),
  "ca-file": line("the path of a PEM file", /^\S{1,200}$/, ""),
  "credentials-file": line("the path of a file of mode 0600", /^\S{1,200}$/, ""),
  pages: oneOf("where the pages read older samples", ["record", "influx"], "record"),
});

const recordSchema = section("a map that says how the record is kept", {
  influx: influxSchema.optional(),
});

export const fileSchema = section("a map of keys, beginning with bench", {
  bench: line("a short name: a-z, 0-9 and -, beginning with a letter", /^[a-z][a-z0-9-]{0,30}$/),
  title: line("one line of text, at most 120 characters", /^[^\r\n]{1,120}$/, ""),
  light: oneOf(
    "how the light is made; limits on a mean current do not see a peak",
    ["continuous"],
    "continuous",
    "light",
  ),
  controller: controllerSchema,
  diode: diodeSchema,
  crystal: crystalSchema.optional(),
  cooling: coolingSchema.optional(),
  limits: limitsSchema,
  derating: deratingSchema,
  channels: z
    .record(z.string(), conversionSchema, { error: () => "a map of channels" })
    .describe("How raw counts become units. A channel not listed keeps the board's own scale.")
    .optional(),
  hazards: hazardsSchema.optional(),
  protections: protectionsSchema.optional(),
  record: recordSchema.optional(),
  witness: witnessSchema.optional(),
});
export type BenchFile = z.output<typeof fileSchema>;
