import { z } from "zod";
import { ENFORCEMENTS } from "../model/stream.ts";

/** The one description of what travels over the switch, the desk and `--json`. */

export const StateName = z.enum(["offline", "standby", "armed", "emitting", "tripped"]);

const number = z.number().nullable();

/** A warning that stands now. */
export const Warning = z.object({
  hazard: z.string(),
  words: z.string(),
  since: z.number(),
});

/** Everything one look needs. Sent ten times a second at most; null where a value is not known. */
export const Snapshot = z.object({
  bench: z.string(),
  title: z.string(),
  /** Wall clock of the daemon, ms since 1970. */
  at: z.number(),
  state: StateName,
  capped: z.boolean(),
  delayLeft_ms: z.number(),
  watchOnly: z.boolean(),
  /** permit: light needs one. toggled: light needs the judge. on-command: it can be cut. none. */
  enforcement: z.enum(ENFORCEMENTS),
  /** What is enforced and what is not, in a sentence. */
  enforced: z.string(),
  builtIn: z.boolean(),
  /** A page on another machine may arm only after an act at the bench within 60 s. */
  hand: z.boolean(),
  asked_mA: number,
  aim_mA: number,
  current_mA: number,
  ceiling_mA: number,
  maker: z.string(),
  makerWords: z.string(),
  floor_mA: number,
  margin_mA: number,
  headroom_mA: number,
  case_degC: number,
  output_mW: number,
  expected_mW: number,
  /** Wavelength of the light that the photodiode stands for, nm. */
  wavelength_nm: z.number(),
  limit_mA: z.number(),
  caseTrip_degC: number,
  caseWarn_degC: number,
  timeToCap_s: number,
  cause: z.object({ code: z.number(), id: z.string(), words: z.string() }).nullable(),
  /** When the last change of state was, wall ms. */
  since: z.number(),
  sentence: z.string(),
  next: z.string(),
  warnings: z.array(Warning),
  /** Milliseconds since the last sample; null before any. */
  age_ms: number,
  link: z.object({
    phase: z.string(),
    words: z.string(),
    rate_perS: z.number(),
    term_ms: z.number(),
    fall_ms: z.number(),
    loopDelay_ms: number,
    loopDelayWorst_ms: number,
    lost: z.number(),
    garbled: z.number(),
    badLines: z.number(),
  }),
  recorder: z.object({ behind_ms: z.number(), words: z.string() }),
  safety: z.string(),
});
export type Snapshot = z.infer<typeof Snapshot>;

/** One event in words, as the pages and `watch` get it. */
export const EventLine = z.object({
  id: z.number(),
  at: z.number(),
  kind: z.string(),
  hazard: z.string(),
  /** calm: expected; warn; trip. Decides the mark: dot, diamond, square. */
  weight: z.enum(["calm", "warn", "trip"]),
  words: z.string(),
});
export type EventLine = z.infer<typeof EventLine>;

const asker = z.enum(["person", "page", "script", "away", "scripted-person"]);

/** What may be asked over the switch: one JSON object a line. */
export const SwitchRequest = z.discriminatedUnion("verb", [
  z.object({ id: z.number(), verb: z.literal("dark"), asker: asker.default("person") }),
  z.object({ id: z.number(), verb: z.literal("status") }),
  z.object({ id: z.number(), verb: z.literal("watch") }),
  z.object({
    id: z.number(),
    verb: z.literal("arm"),
    current_mA: z.number(),
    asker: asker.default("person"),
  }),
  z.object({
    id: z.number(),
    verb: z.literal("set"),
    current_mA: z.number(),
    asker: asker.default("person"),
  }),
  z.object({
    id: z.number(),
    verb: z.literal("reset"),
    /** Identifier of the cause being cleared, as `status` names it. */
    cause: z.string(),
    asker: asker.default("person"),
  }),
  z.object({
    id: z.number(),
    verb: z.literal("adopt"),
    benchText: z.string(),
    confirm: z.boolean(),
  }),
  /** What arming at this current would mean, in a sentence to read back. Changes nothing. */
  z.object({ id: z.number(), verb: z.literal("mean"), current_mA: z.number() }),
  z.object({ id: z.number(), verb: z.literal("rawlog") }),
  z.object({ id: z.number(), verb: z.literal("sign") }),
  z.object({ id: z.number(), verb: z.literal("stop") }),
]);
export type SwitchRequest = z.infer<typeof SwitchRequest>;

/** The answer to one request. `words` is a whole sentence; `reason` names a refusal. */
export const SwitchAnswer = z.object({
  id: z.number(),
  ok: z.boolean(),
  reason: z.string(),
  words: z.string(),
  /** Highest current allowed now, mA, where a current was refused. */
  highest_mA: number.optional(),
  snapshot: Snapshot.optional(),
  lines: z.array(z.string()).optional(),
  /** Address to open, where `sign` asked for one. */
  address: z.string().optional(),
});
export type SwitchAnswer = z.infer<typeof SwitchAnswer>;

/** What a watcher gets, one JSON object a line. */
export const SwitchPush = z.union([
  z.object({ push: z.literal("snapshot"), snapshot: Snapshot }),
  z.object({ push: z.literal("event"), event: EventLine }),
]);
export type SwitchPush = z.infer<typeof SwitchPush>;
