import { z } from "zod";
import { EventLine, Snapshot, SwitchAnswer } from "../control/api.ts";
import { EPOCH_PARTS } from "../model/epoch.ts";
import { STREAM_FORMATS } from "../model/stream.ts";

/**
 * What each command prints with `--json`. A command prints through its schema (`printJson`), so that
 * what is described here is what scripts get.
 */

/** arm, set, reset: what the judge answered. */
export const Told = SwitchAnswer.omit({ id: true, snapshot: true, address: true });

/** adopt: the differences, and whether the file is in use now. */
export const Adopted = Told.extend({ adopted: z.boolean() });

/** status: everything one look needs. */
export { Snapshot as Status };

/** check: every problem with its place. */
export const Checked = z.strictObject({
  ok: z.boolean(),
  problems: z.array(
    z.strictObject({
      level: z.enum(["error", "warning"]),
      code: z.string(),
      path: z.string(),
      line: z.number().int(),
      column: z.number().int(),
      found: z.string(),
      wanted: z.string(),
      do: z.string(),
    }),
  ),
});

/** check --explain: what a code or a row means, in sentences. */
export const Explained = z.strictObject({ row: z.string(), lines: z.array(z.string()) });

/** init: what was written, and what to do next. */
export const Initiated = z.strictObject({
  file: z.string(),
  bench: z.string(),
  hints: z.number().int(),
  next: z.array(z.string()),
});

/** change --list: changes by hand, oldest first. */
export const Epochs = z.array(
  z.strictObject({
    id: z.number().int(),
    bench: z.string(),
    part: z.enum(EPOCH_PARTS),
    at: z.number(),
    serial: z.string(),
    note: z.string(),
    who: z.string(),
    values: z.record(z.string(), z.string()),
  }),
);

/** reading --list: readings of witnesses, oldest first. */
export const Readings = z.array(
  z.strictObject({
    id: z.number().int(),
    bench: z.string(),
    name: z.string(),
    at: z.number(),
    value: z.number(),
    unit: z.string(),
    typed: z.boolean(),
    who: z.string(),
    note: z.string(),
  }),
);

/** dark: which way each bench was reached. */
export const Darkened = z.strictObject({
  benches: z.array(
    z.strictObject({
      bench: z.string(),
      ok: z.boolean(),
      way: z.enum(["switch", "dark port", "daemon ended"]),
      words: z.string(),
    }),
  ),
});
export type Darkened = z.infer<typeof Darkened>["benches"][number];

/** demo: what a simulated night came to. The same seed gives the same but for `wallSeconds`. */
export const NightSummary = z.strictObject({
  simulatedSeconds: z.number(),
  samples: z.number().int(),
  sessions: z.number().int(),
  trips: z.array(z.strictObject({ firstOut: z.string(), atSeconds: z.number() })),
  warnings: z.number().int(),
  cappedSeconds: z.number(),
  highestCaseC: z.number(),
  wallSeconds: z.number(),
  seed: z.number().int(),
});
export type NightSummary = z.infer<typeof NightSummary>;

/** export: the sessions of a record, oldest first. */
export const Sessions = z.array(
  z.strictObject({
    id: z.number().int(),
    /** The life of the daemon that it belongs to. */
    run: z.number().int(),
    bench: z.string(),
    kind: z.string(),
    /** Wall clock, ms since 1970; `ended` is null while it goes on. */
    started: z.number(),
    ended: z.number().nullable(),
    last: z.number(),
    samples: z.number().int(),
    benchFile: z.number().int(),
  }),
);

/** listen: one object a line. */
export const Heard = z.strictObject({ line: z.string(), broken: z.string().nullable() });

/** listen --guess: what a stream probably is; `piece` is a section of a bench file. */
export const Guessed = z.strictObject({
  baud: z.number().int(),
  format: z.enum(STREAM_FORMATS).nullable(),
  columns: z.array(
    z.strictObject({
      name: z.string(),
      channel: z.string(),
      unit: z.string(),
      confidence: z.number(),
    }),
  ),
  undecided: z.array(z.string()),
  piece: z.string(),
});

/** open: an address that signs a page in, once. */
export const Opened = z.strictObject({ address: z.string() });

/** ports: serial ports; `problem` is empty where nothing stands in the way. */
export const Ports = z.array(
  z.strictObject({
    path: z.string(),
    description: z.string(),
    problem: z.string(),
    driver: z.string(),
    group: z.string(),
    allowed: z.boolean(),
    owner: z.string(),
    /** Null where it is not known, or no USB device. */
    powerSaving: z.boolean().nullable(),
    latency_ms: z.number().nullable(),
    advice: z.array(
      z.strictObject({
        code: z.enum([
          "permission",
          "taken",
          "prober",
          "power-saving",
          "latency",
          "hang-up",
          "resets",
        ]),
        found: z.string(),
        do: z.string(),
      }),
    ),
  }),
);

/** run: one object a line, while it runs. */
export const Running = z.discriminatedUnion("kind", [
  z.strictObject({
    kind: z.literal("started"),
    bench: z.string(),
    pid: z.number().int(),
    page: z.string(),
    darkPort: z.number().int(),
    folder: z.string(),
  }),
  z.strictObject({ kind: z.literal("event"), event: EventLine }),
  z.strictObject({ kind: z.literal("ended"), words: z.string() }),
]);
export type Running = z.infer<typeof Running>;

/** Any command that could not do its work; the same stands on stderr in words. */
export const Failed = z.strictObject({
  ok: z.literal(false),
  reason: z.literal("trouble"),
  words: z.string(),
  do: z.string(),
  exit: z.number().int(),
});
