import { z } from "zod";

/** What `sessions` and its parts print with `--json`. Times are wall clock, ms since 1970. */

export const SessionLine = z.strictObject({
  id: z.number().int(),
  run: z.number().int(),
  bench: z.string(),
  /** lit: arming to dark; dark: connected without light; watched: watched only, or imported. */
  kind: z.string(),
  started: z.number(),
  /** Null while it goes on. */
  ended: z.number().nullable(),
  last: z.number(),
  length_ms: z.number(),
  samples: z.number().int(),
  benchFile: z.number().int(),
  /** mA, while there was light; null where there was none. */
  current: z.strictObject({ min: z.number(), max: z.number() }).nullable(),
  /** Mean output at its beginning and end, in `unit`; null where there was none. */
  output: z.strictObject({ first: z.number(), last: z.number(), unit: z.string() }).nullable(),
  trips: z.number().int(),
  notes: z.number().int(),
  tags: z.array(z.string()),
});
export type SessionLine = z.infer<typeof SessionLine>;

/** sessions: oldest first. */
export const SessionList = z.array(SessionLine);

/** sessions show. */
export const SessionShown = z.strictObject({
  session: SessionLine,
  channels: z.array(z.strictObject({ name: z.string(), unit: z.string() })),
  /** Stretches without samples. */
  gaps: z.array(z.strictObject({ from: z.number(), to: z.number() })),
  events: z.array(
    z.strictObject({
      id: z.number().int(),
      at: z.number(),
      kind: z.string(),
      hazard: z.string(),
      words: z.string(),
    }),
  ),
  notes: z.array(
    z.strictObject({
      id: z.number().int(),
      at: z.number(),
      who: z.string(),
      text: z.string(),
      pictureType: z.string().nullable(),
      pictureBytes: z.number().int(),
    }),
  ),
  /** SHA-256 of the bench file by which it was judged. */
  benchFileHash: z.string(),
});
export type SessionShown = z.infer<typeof SessionShown>;

/** sessions verify. */
export const SessionsVerified = z.strictObject({
  ok: z.boolean(),
  sessions: z.number().int(),
  blocks: z.number().int(),
  samples: z.number().int(),
  gaps: z.number().int(),
  /** Each names its place. */
  faults: z.array(z.string()),
});

/** sessions pack. */
export const SessionPacked = z.strictObject({
  file: z.string(),
  bench: z.string(),
  session: z.number().int(),
  bytes: z.number().int(),
});

/** sessions import: `session` is null where it was only checked. */
export const SessionImported = z.strictObject({
  session: z.number().int().nullable(),
  rows: z.number().int(),
  from: z.number(),
  to: z.number(),
  ratePerS: z.number(),
  channels: z.array(z.strictObject({ name: z.string(), unit: z.string() })),
  badRows: z.number().int(),
  /** The first thousand, by line of the file. */
  bad: z.array(z.strictObject({ line: z.number().int(), why: z.string() })),
});

/** sessions note, tag, unpack: number of what was made, 0 where nothing was. */
export const SessionKept = z.strictObject({ id: z.number().int(), words: z.string() });
