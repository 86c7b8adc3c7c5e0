import { z } from "zod";
import { parseQuantity } from "../model/quantities.ts";
import { KINDS, type QuantityKind } from "../model/quantity-units.ts";
import {
  boundWords,
  lineShape,
  numberShape,
  quantityShape,
  sentence,
  wordShape,
  yesNoShape,
} from "./field-shapes.ts";
import { nearest } from "./near.ts";

/**
 * The kinds of value a bench file has, as zod schemas over text. Every refusal carries what was
 * found, what is wanted and what to do in its `params`; `parse.ts` adds the place.
 */
export interface Refusal {
  readonly code: string;
  readonly found: string;
  readonly wanted: string;
  readonly do: string;
}

export interface Bounds {
  /** Smallest and largest value allowed, in the held unit, both included. */
  readonly min: number;
  readonly max: number;
}

type Taken<T> = { readonly value: T } | { readonly refusal: Refusal };

/** A field read by `take` from the text at its place; undefined where the key is missing. */
function field<T>(take: (found: string | undefined) => Taken<T>, shape: string) {
  return z
    .unknown()
    .optional()
    .transform((found, context): T => {
      const taken =
        found === undefined || typeof found === "string"
          ? take(found)
          : refusal("shape", listOrMap(found), shape, "write one value here, on one line");
      if ("value" in taken) return taken.value;
      context.addIssue({ code: "custom", params: { ...taken.refusal }, message: taken.refusal.do });
      return z.NEVER;
    });
}

const listOrMap = (found: unknown): string => (Array.isArray(found) ? "a list" : "a map of keys");

function refusal(
  code: string,
  found: string,
  wanted: string,
  advice: string,
): { refusal: Refusal } {
  return { refusal: { code, found, wanted, do: advice } };
}

const missing = (wanted: string, advice: string): { refusal: Refusal } =>
  refusal("missing", "nothing", wanted, advice);

/** A quantity of that kind within bounds. Without a default the key must be there. */
export function quantity(kind: QuantityKind, bounds: Bounds, fallback?: number) {
  const spec = KINDS[kind];
  const shape = `${spec.name}, such as ${spec.example}`;
  return field<number>((found) => {
    if (found === undefined) {
      if (fallback !== undefined) return { value: fallback };
      return missing(shape, `add this key, with ${spec.name} such as ${spec.example}`);
    }
    const parsed = parseQuantity(kind, found);
    if (!parsed.ok) return refusal("quantity", parsed.found, parsed.wanted, parsed.do);
    if (parsed.value >= bounds.min && parsed.value <= bounds.max) return { value: parsed.value };
    const range = `${boundWords(kind, bounds.min)} to ${boundWords(kind, bounds.max)}`;
    return refusal("range", found.trim(), range, "write a value in this range");
  }, shape).meta(quantityShape(kind, bounds, fallback));
}

/** A quantity, or the word `none`, which reads as null. A missing key reads as the default. */
export function quantityOrNone(kind: QuantityKind, bounds: Bounds, fallback: number | null) {
  const inner = quantity(kind, bounds);
  return z
    .unknown()
    .optional()
    .transform((found, context): number | null => {
      if (found === undefined) return fallback;
      if (found === "none") return null;
      return runInner(inner, found, context);
    })
    .meta(quantityShape(kind, bounds, fallback ?? undefined, true));
}

/** Runs another field at the same place and passes its refusals on. */
function runInner<T>(inner: z.ZodType<T>, found: unknown, context: z.core.$RefinementCtx): T {
  const result = inner.safeParse(found);
  if (result.success) return result.data;
  for (const issue of result.error.issues) {
    context.addIssue({
      code: "custom",
      params: "params" in issue ? (issue.params as Record<string, unknown>) : {},
      message: issue.message,
    });
  }
  return z.NEVER;
}

/** A plain number without a unit (an exponent, a coefficient, a seed). */
export function plainNumber(what: string, bounds: Bounds, fallback?: number) {
  const wanted = `${what}, a number from ${bounds.min} to ${bounds.max} without a unit`;
  return field<number>((found) => {
    if (found === undefined) {
      return fallback === undefined ? missing(wanted, "add this key") : { value: fallback };
    }
    const plain = found.trim();
    const value = /^[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d{1,3})?$/.test(plain)
      ? Number(plain)
      : Number.NaN;
    if (value >= bounds.min && value <= bounds.max) return { value };
    return refusal("number", plain === "" ? "nothing" : plain, wanted, "write the number alone");
  }, wanted).meta(numberShape(what, "number", bounds, fallback));
}

/** A whole number without a unit. */
export const wholeNumber = (what: string, bounds: Bounds, fallback?: number) =>
  plainNumber(what, bounds, fallback)
    .transform((value, context) => {
      if (Number.isInteger(value)) return value;
      const advice = "write a whole number";
      const params = { code: "number", found: String(value), wanted: `${what}, whole`, do: advice };
      context.addIssue({ code: "custom", params, message: advice });
      return z.NEVER;
    })
    .meta(numberShape(what, "integer", bounds, fallback));

/** `yes` or `no`. */
export function yesNo(what: string, fallback?: boolean) {
  const wanted = `yes or no: ${what}`;
  return field<boolean>((found) => {
    if (found === undefined) {
      return fallback === undefined ? missing(wanted, "add this key") : { value: fallback };
    }
    if (found === "yes" || found === "true") return { value: true };
    if (found === "no" || found === "false") return { value: false };
    return refusal("word", found === "" ? "nothing" : found, wanted, "write yes or no");
  }, wanted).meta(yesNoShape(what, fallback));
}

/** One of a few words. `code` names the refusal of any other. */
export function oneOf<const W extends string>(
  what: string,
  words: readonly W[],
  fallback?: W,
  code = "word",
) {
  const wanted = `${what}: ${words.join(", ")}`;
  return field<W>((found) => {
    if (found === undefined) {
      return fallback === undefined ? missing(wanted, "add this key") : { value: fallback };
    }
    const word = words.find((candidate) => candidate === found);
    if (word !== undefined) return { value: word };
    const near = nearest(found, words);
    const advice = near === null ? "write one of these words" : `did you mean ${near}?`;
    return refusal(code, found === "" ? "nothing" : found, wanted, advice);
  }, wanted).meta(wordShape(what, words, fallback));
}

/** A line of text that fits a pattern. */
export function line(wanted: string, pattern: RegExp, fallback?: string) {
  return field<string>((found) => {
    if (found === undefined) {
      return fallback === undefined ? missing(wanted, "add this key") : { value: fallback };
    }
    if (pattern.test(found)) return { value: found };
    return refusal("text", found === "" ? "nothing" : found.slice(0, 60), wanted, "rewrite it so");
  }, wanted).meta(lineShape(wanted, pattern, fallback));
}

/**
 * A map with exactly these keys. The issue's message is `what` where there is no map, and the legal
 * keys, parted by spaces, where there are unknown ones.
 */
export function section<S extends z.core.$ZodLooseShape>(what: string, shape: S) {
  return z
    .strictObject(shape, {
      error: (issue) => (issue.code === "unrecognized_keys" ? Object.keys(shape).join(" ") : what),
    })
    .describe(sentence(what));
}
