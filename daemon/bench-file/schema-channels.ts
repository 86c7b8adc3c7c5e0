import { z } from "zod";
import { parseQuantity } from "../model/quantities.ts";
import { KINDS, type QuantityKind } from "../model/quantity-units.ts";
import { oneOf, plainNumber, quantity, section, wholeNumber } from "./fields.ts";

/** How a channel's counts become its unit, as the file writes it: exactly one law a channel. */
const divider = {
  fixed: quantity("resistance", { min: 1, max: 10_000_000 }),
  place: oneOf("where the sensor sits in the divider", ["to-ground", "to-supply"], "to-ground"),
  full: quantity("count", { min: 16, max: 16_777_216 }),
  supply: quantity("voltage", { min: 100, max: 50_000 }).optional(),
  dissipation: quantity("dissipation", { min: 0.01, max: 1000 }).optional(),
};

const any = <T extends z.ZodType>(schema: T) => schema.optional();

export const conversionSchema = section(
  "a map with one law: linear, ntc, steinhart-hart or platinum",
  {
    version: wholeNumber("the version of this calibration", { min: 1, max: 1_000_000 }, 1),
    error: freeQuantity(),
    linear: any(
      section("a map of per-count and offset", {
        "per-count": freeQuantity(),
        offset: freeQuantity().optional(),
      }),
    ),
    ntc: any(
      section("a map of r25, beta, fixed, place and full", {
        r25: quantity("resistance", { min: 1, max: 10_000_000 }),
        beta: quantity("difference", { min: 500, max: 10_000 }),
        ...divider,
      }),
    ),
    "steinhart-hart": any(
      section("a map of a, b, c, fixed, place and full", {
        a: plainNumber("coefficient A in 1/K", { min: -0.1, max: 0.1 }),
        b: plainNumber("coefficient B in 1/K", { min: -0.1, max: 0.1 }),
        c: plainNumber("coefficient C in 1/K", { min: -0.1, max: 0.1 }),
        ...divider,
      }),
    ),
    platinum: any(
      section("a map of r0, fixed, place and full", {
        r0: quantity("resistance", { min: 1, max: 100_000 }),
        ...divider,
      }),
    ),
  },
);

export interface FreeQuantity {
  readonly kind: QuantityKind;
  readonly value: number;
}

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
    });
}
