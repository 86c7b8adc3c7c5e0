import { z } from "zod";
import { parseQuantity } from "../model/quantities.ts";
import { KINDS, type QuantityKind } from "../model/quantity-units.ts";
import { freeShape } from "./field-shapes.ts";
import { oneOf, plainNumber, quantity, section, wholeNumber } from "./fields.ts";

/** Kinds a channel may be measured in. */
const FREE: readonly QuantityKind[] = [
  "current",
  "temperature",
  "difference",
  "power",
  "voltage",
  "resistance",
  "ratio",
  "count",
];

/** How a channel's counts become its unit, as the file writes it: exactly one law a channel. */
const divider = {
  fixed: quantity("resistance", { min: 1, max: 10_000_000 }).describe(
    "The resistor that makes the divider with the sensor.",
  ),
  place: oneOf(
    "where the sensor sits in the divider",
    ["to-ground", "to-supply"],
    "to-ground",
  ).describe("Where the sensor sits in the divider."),
  full: quantity("count", { min: 16, max: 16_777_216 }).describe(
    "Counts at full supply: 1024 for ten bits, 16384 where sixteen of those are added.",
  ),
  supply: quantity("voltage", { min: 100, max: 50_000 })
    .describe("Supply of the divider, for telling how much it warms the sensor.")
    .optional(),
  dissipation: quantity("dissipation", { min: 0.01, max: 1000 })
    .describe("Dissipation constant of the sensor where it sits.")
    .optional(),
};

const any = <T extends z.ZodType>(schema: T) => schema.optional();

export const conversionSchema = section(
  "a map with one law: linear, ntc, steinhart-hart or platinum",
  {
    version: wholeNumber("the version of this calibration", { min: 1, max: 1_000_000 }, 1).describe(
      "Counts up with each calibration.",
    ),
    error: freeQuantity().describe(
      "Half width of the reading's stated error; limits are taken at its edge.",
    ),
    linear: any(
      section("a map of per-count and offset", {
        "per-count": freeQuantity().describe("What one count stands for."),
        offset: freeQuantity().describe("The value at zero counts.").optional(),
      }),
    ),
    ntc: any(
      section("a map of r25, beta, fixed, place and full", {
        r25: quantity("resistance", { min: 1, max: 10_000_000 }).describe(
          "Resistance of the thermistor at 25 °C.",
        ),
        beta: quantity("difference", { min: 500, max: 10_000 }).describe("The thermistor's beta."),
        ...divider,
      }),
    ),
    "steinhart-hart": any(
      section("a map of a, b, c, fixed, place and full", {
        a: plainNumber("coefficient A in 1/K", { min: -0.1, max: 0.1 }).describe(
          "Coefficient A of the Steinhart–Hart law, R in ohm.",
        ),
        b: plainNumber("coefficient B in 1/K", { min: -0.1, max: 0.1 }).describe(
          "Coefficient B of the Steinhart–Hart law.",
        ),
        c: plainNumber("coefficient C in 1/K", { min: -0.1, max: 0.1 }).describe(
          "Coefficient C of the Steinhart–Hart law.",
        ),
        ...divider,
      }),
    ),
    platinum: any(
      section("a map of r0, fixed, place and full", {
        r0: quantity("resistance", { min: 1, max: 100_000 }).describe(
          "Resistance at 0 °C: 100 ohm or 1000 ohm.",
        ),
        ...divider,
      }),
    ),
  },
);

export interface FreeQuantity {
  readonly kind: QuantityKind;
  readonly value: number;
}

/** A quantity of whichever kind its unit says. */
function freeQuantity() {
  return z
    .unknown()
    .optional()
    .transform((found, context): FreeQuantity => {
      const text = typeof found === "string" ? found : "";
      for (const kind of FREE) {
        const parsed = parseQuantity(kind, text);
        if (parsed.ok) return { kind, value: parsed.value };
      }
      const advice = "write the number with the channel's unit";
      const params = {
        code: found === undefined ? "missing" : "quantity",
        found: text === "" ? "nothing" : text.slice(0, 60),
        wanted: `a quantity with its unit, such as ${KINDS.power.example} or ${KINDS.difference.example}`,
        do: advice,
      };
      context.addIssue({ code: "custom", params, message: advice });
      return z.NEVER;
    })
    .meta(freeShape(FREE));
}
