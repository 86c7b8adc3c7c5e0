import { formatQuantity } from "../model/quantities.ts";
import { KINDS, type QuantityKind } from "../model/quantity-units.ts";

/**
 * What a field looks like to an editor: JSON Schema keywords, and under `says` a sentence on form
 * and bounds, which `json-schema.ts` puts behind the key's own description.
 */
export interface FieldShape {
  readonly [keyword: string]: unknown;
  readonly says: string;
}

const NUMBER = "[-+\\u2212]?(\\d+(\\.\\d+)?|\\.\\d+)([eE][+-]?\\d{1,3})?";

/** Pattern of a quantity of any of these kinds, as `parseQuantity` reads it. */
function quantityPattern(kinds: readonly QuantityKind[], orWords: readonly string[]): string {
  const symbols = new Set(kinds.flatMap((kind) => KINDS[kind].units.map((unit) => unit.symbol)));
  const quantity = `\\s*${NUMBER}\\s*(${[...symbols].join("|")})\\s*`;
  return `^(${[quantity, ...orWords].join("|")})$`;
}

interface Bounds {
  readonly min: number;
  readonly max: number;
}

/** A description as a sentence. */
export const sentence = (words: string): string =>
  `${words.charAt(0).toUpperCase()}${words.slice(1)}.`;

const leftOut = (words: string | null): string =>
  words === null ? "" : ` Left out: ${words.replaceAll("\u00a0", " ")}.`;

/** A bound with as many digits as it needs. */
export function boundWords(kind: QuantityKind, value: number): string {
  const step = KINDS[kind].resolution;
  return formatQuantity(
    kind,
    value,
    value !== 0 && Math.abs(value) < step ? Math.abs(value) : step,
  );
}

export function quantityShape(
  kind: QuantityKind,
  { min, max }: Bounds,
  fallback: number | undefined,
  orNone = false,
): FieldShape {
  const spec = KINDS[kind];
  const from = boundWords(kind, min).replaceAll("\u00a0", " ");
  const to = boundWords(kind, max).replaceAll("\u00a0", " ");
  const rest = Number.isNaN(fallback) ? "the row's default" : null;
  const shown = fallback === undefined ? null : (rest ?? boundWords(kind, fallback));
  const none = orNone ? ", or none" : "";
  return {
    type: "string",
    pattern: quantityPattern([kind], orNone ? ["none"] : []),
    examples: orNone ? [spec.example, "none"] : [spec.example],
    says: `${sentence(`${spec.name} with its unit${none}, ${from} to ${to}`)}${leftOut(shown)}`,
  };
}

/** A quantity of whichever of these kinds its unit says. */
export const freeShape = (kinds: readonly QuantityKind[]): FieldShape => ({
  type: "string",
  pattern: quantityPattern(kinds, []),
  examples: kinds.map((kind) => KINDS[kind].example),
  says: "A quantity with the channel's unit.",
});

export const numberShape = (
  what: string,
  type: "number" | "integer",
  { min, max }: Bounds,
  fallback: number | undefined,
): FieldShape => ({
  description: sentence(what),
  type,
  minimum: min,
  maximum: max,
  says: `A number from ${min} to ${max} without a unit.${leftOut(fallback === undefined ? null : String(fallback))}`,
});

export const yesNoShape = (what: string, fallback: boolean | undefined): FieldShape => ({
  description: sentence(what),
  enum: ["yes", "no", true, false],
  says: `Yes or no.${leftOut(fallback === undefined ? null : fallback ? "yes" : "no")}`,
});

export const wordShape = (
  what: string,
  words: readonly string[],
  fallback: string | undefined,
): FieldShape => ({
  description: sentence(what),
  enum: [...words],
  says: `One of ${words.join(", ")}.${leftOut(fallback ?? null)}`,
});

/** A number is a text too, where YAML takes it for one. */
export const lineShape = (
  wanted: string,
  pattern: RegExp,
  fallback: string | undefined,
): FieldShape => ({
  type: ["string", "number"],
  pattern: pattern.source,
  says: `${sentence(wanted)}${leftOut(fallback === undefined || fallback === "" ? null : fallback)}`,
});
