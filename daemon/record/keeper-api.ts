import { z } from "zod";
import { EPOCH_PARTS } from "../model/epoch.ts";

/** What may be asked of whoever has the record open for writing: one JSON object a line. */
export const KeeperRequest = z.discriminatedUnion("verb", [
  z.strictObject({
    verb: z.literal("note"),
    session: z.number().int().nullable(),
    /** Its place on the time axis, wall ms since 1970; null is now. */
    wall_ms: z.number().nullable(),
    who: z.string().max(80),
    text: z.string(),
    /** A PNG or JPEG, base64; null for none. */
    picture: z.base64().nullable(),
  }),
  z.strictObject({
    verb: z.literal("tag"),
    session: z.number().int(),
    tag: z.string(),
    does: z.enum(["set", "remove"]),
  }),
  /** A change by hand. Texts that are not told are empty; `values` are written with their units. */
  z.strictObject({
    verb: z.literal("epoch"),
    bench: z.string(),
    part: z.enum(EPOCH_PARTS),
    wall_ms: z.number().nullable(),
    serial: z.string(),
    note: z.string(),
    who: z.string().max(80),
    values: z.record(z.string(), z.string()),
  }),
  /** What a witness read, or a person typed. */
  z.strictObject({
    verb: z.literal("reading"),
    bench: z.string(),
    name: z.string(),
    wall_ms: z.number().nullable(),
    value: z.number(),
    unit: z.string(),
    typed: z.boolean(),
    note: z.string(),
    who: z.string().max(80),
  }),
  /** Takes the full rate of old samples away; null for no such bound, or for whatever was exported. */
  z.strictObject({
    verb: z.literal("retire"),
    days: z.number().min(1).nullable(),
    gigabytes: z.number().positive().nullable(),
    exportedTo: z.string().max(80).nullable(),
  }),
  /** The file is read by the recorder itself, so its name is a whole path. */
  z.strictObject({ verb: z.literal("unpack"), file: z.string() }),
]);
export type KeeperRequest = z.infer<typeof KeeperRequest>;

/** What comes back: any number of lines about how far it is, then one answer. */
export const KeeperReply = z.discriminatedUnion("kind", [
  z.strictObject({ kind: z.literal("progress"), done: z.number(), total: z.number() }),
  z.strictObject({
    kind: z.literal("done"),
    /** Number of what was made: a note or a session; 0 where nothing was. */
    id: z.number().int(),
    words: z.string(),
  }),
  z.strictObject({
    kind: z.literal("refused"),
    what: z.string(),
    found: z.string(),
    do: z.string(),
  }),
]);
export type KeeperReply = z.infer<typeof KeeperReply>;
/** The answer to a request that was carried out. */
export type KeeperDone = Extract<KeeperReply, { kind: "done" }>;
