import { z } from "zod";
import { fileSchema } from "./schema.ts";

/** How many spaces the published file is indented by. */
const INDENT = 2;

type Json = Record<string, unknown>;

/**
 * The bench file's shape as JSON Schema (draft 7, which editors read): made from the same fields that
 * read the file, so that an editor and `check` cannot differ on keys, kinds and units. What depends
 * on more than one value only `check` knows.
 */
export function benchJsonSchema(): Json {
  const made = z.toJSONSchema(fileSchema, {
    io: "input",
    target: "draft-7",
    unrepresentable: "any",
    override: ({ zodSchema, jsonSchema }) => finish(zodSchema, jsonSchema as Json),
  });
  return {
    ...made,
    title: "beamsitter bench file",
    description: "One laser with its controller. `beamsitter check FILE` tells what no schema can.",
  };
}

/** The published file's text. */
export const benchJsonSchemaText = (): string =>
  `${JSON.stringify(benchJsonSchema(), null, INDENT)}\n`;

function finish(schema: z.core.$ZodType, json: Json): void {
  if (typeof json.says === "string") {
    const own = typeof json.description === "string" ? `${json.description} ` : "";
    json.description = `${own}${json.says}`;
    delete json.says;
  }
  const { def } = schema._zod;
  if (def.type === "record") json.description ??= "A map of names.";
  if (def.type !== "object") return;
  // Every field takes undefined as input, to say in its own words what is missing: so it is asked.
  const shape = (def as z.core.$ZodObjectDef).shape as Readonly<Record<string, z.ZodType>>;
  const required = Object.keys(shape).filter((key) => !shape[key]?.safeParse(undefined).success);
  if (required.length > 0) json.required = required;
}
