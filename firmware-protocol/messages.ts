import { z } from "zod";
import {
  anything,
  between,
  h32,
  i32,
  matching,
  oneOf,
  scale,
  u8,
  u16,
  u32,
  word,
} from "./fields.ts";
import { type Broken, brokenAs, type Frame, looksDark, openFrame, type Side } from "./line.ts";
import { readHexText } from "./numbers.ts";
import { readPermit } from "./permit.ts";
import { GROUP_MAX, readSample } from "./sample.ts";

/** The version of the protocol that this codec speaks. */
export const PROTOCOL_VERSION = 1;

/** A verb: who receives it, its fields in words, and their reader (null where the form is wrong). */
interface MessageKind<T> {
  readonly to: Side;
  readonly grammar: string;
  readonly read: (fields: readonly string[]) => T | null;
}

const bySchema = <S extends z.ZodType>(
  to: Side,
  grammar: string,
  schema: S,
): MessageKind<z.output<S>> => ({
  to,
  grammar,
  read: (fields) => {
    const result = schema.safeParse(fields);
    return result.success ? result.data : null;
  },
});

/** `dark` takes a person's 0 or a host's cause; the board's own causes are not the host's to give. */
const orderedCause = u8.refine((n) => n === 0 || (n >= 64 && n <= 254));

const PURPOSES = ["arm", "inject"] as const;
const BOOT_CAUSES = ["power", "brown-out", "watchdog", "external", "unknown"] as const;
const MOVES = ["open", "close"] as const;

const toController = {
  who: bySchema(
    "controller",
    "VERSION",
    z.tuple([u8]).transform(([version]) => ({ version })),
  ),
  ask: bySchema(
    "controller",
    "arm|inject",
    z.tuple([oneOf(PURPOSES)]).transform(([purpose]) => ({ purpose })),
  ),
  arm: {
    to: "controller",
    grammar: "ANSWER",
    read: (fields: readonly string[]) => {
      const answer = fields.length === 1 ? readHexText(fields[0] ?? "", 8) : null;
      return answer === null ? null : { answer };
    },
  } satisfies MessageKind<{ answer: string }>,
  permit: {
    to: "controller",
    grammar: "SESSION N CAP AIM TERM [AMPLITUDE/PERIOD]",
    read: readPermit,
  } satisfies MessageKind<NonNullable<ReturnType<typeof readPermit>>>,
  dark: bySchema(
    "controller",
    "CODE",
    z.tuple([orderedCause]).transform(([code]) => ({ code })),
  ),
  reset: bySchema(
    "controller",
    "CAUSE",
    z.tuple([u8]).transform(([cause]) => ({ cause })),
  ),
  stage: bySchema(
    "controller",
    "COUNT",
    z.tuple([u8]).transform(([count]) => ({ count })),
  ),
  point: bySchema(
    "controller",
    "I X Y",
    z.tuple([u8, u16, u16]).transform(([i, x, y]) => ({ i, x, y })),
  ),
  commit: bySchema(
    "controller",
    "CRC",
    z.tuple([h32]).transform(([crc]) => ({ crc })),
  ),
  readback: bySchema(
    "controller",
    "I",
    z.tuple([u8]).transform(([i]) => ({ i })),
  ),
  inject: bySchema(
    "controller",
    "ROW ANSWER",
    z.tuple([word(12), h32]).transform(([row, answer]) => ({ row, answer })),
  ),
  cool: bySchema(
    "controller",
    "SESSION COUNTS",
    z.tuple([h32, u16]).transform(([session, counts]) => ({ session, counts })),
  ),
  shutter: bySchema(
    "controller",
    "open SESSION|close",
    z.union([
      z.tuple([oneOf(["open"]), h32]).transform(([move, session]) => ({ move, session })),
      z.tuple([oneOf(["close"])]).transform(([move]) => ({ move, session: "" })),
    ]),
  ),
  status: bySchema(
    "controller",
    "",
    z.tuple([]).transform(() => ({})),
  ),
} as const;

const capabilities = matching(
  /^(-|(?=.{1,40}$)[a-z][a-z0-9.-]*(,[a-z][a-z0-9.-]*)*)$/,
  "- or words joined by commas",
).transform((text) => (text === "-" ? [] : text.split(",")));

const serialNumber = matching(/^[A-Z0-9-]{1,12}$/, "1 to 12 of A-Z 0-9 -");

const helloOfThisVersion = z
  .tuple([
    between(PROTOCOL_VERSION, PROTOCOL_VERSION),
    word(20),
    serialNumber,
    u32,
    between(100, 10_000),
    u16,
    h32,
    u16,
    u16,
    u16,
    u16,
    capabilities,
    between(1, 64),
  ])
  .transform(
    ([
      proto,
      firmware,
      serial,
      boot,
      tick_us,
      absolute,
      curve,
      termMin,
      termMax,
      fall_ms,
      rate,
      caps,
      channels,
    ]) => ({
      proto,
      firmware,
      serial,
      boot,
      tick_us,
      absolute,
      curve,
      termMin,
      termMax,
      fall_ms,
      rate,
      caps,
      channels,
    }),
  );

/** Another version may have any fields after its own number. */
const helloOfAnotherVersion = z
  .tuple([u8.refine((n) => n !== PROTOCOL_VERSION)], anything)
  .transform(([proto]) => ({ proto, firmware: null }));

/** What was accepted, and the number or word that the answer repeats. */
const acceptedAs = <const V extends string, T extends z.ZodType>(verb: V, value: T) =>
  z.tuple([oneOf([verb]), value]).transform(([, read]) => ({ verb, value: read }));

const accepted = z.union([
  acceptedAs("arm", h32),
  acceptedAs("dark", orderedCause),
  acceptedAs("reset", u8),
  acceptedAs("stage", u8),
  acceptedAs("point", u8),
  acceptedAs("commit", h32),
  acceptedAs("inject", word(12)),
  acceptedAs("cool", u16),
  acceptedAs("shutter", oneOf(MOVES)),
]);

type ControllerVerb = keyof typeof toController;
const CONTROLLER_VERBS = Object.keys(toController) as ControllerVerb[];
const DETAILED = ["permit", "who"] as const;
const PLAIN = CONTROLLER_VERBS.filter((verb) => !DETAILED.some((d) => d === verb));

const reason = word(12);
const refused = z.union([
  z.tuple([oneOf(["permit"]), reason, u32.optional()]),
  z.tuple([oneOf(["who"]), reason, u8.optional()]),
  z.tuple([oneOf(PLAIN), reason], anything),
]);

const toHost = {
  boot: bySchema(
    "host",
    "FIRMWARE CAUSE",
    z.tuple([word(20), oneOf(BOOT_CAUSES)]).transform(([firmware, cause]) => ({ firmware, cause })),
  ),
  hello: bySchema(
    "host",
    "PROTO FIRMWARE SERIAL BOOT TICKUS ABSOLUTE CURVE TERMMIN TERMMAX FALL RATE CAPS CHANNELS",
    z.union([helloOfThisVersion, helloOfAnotherVersion]),
  ),
  channel: bySchema(
    "host",
    "INDEX NAME UNIT SCALE MIN MAX GROUP",
    z
      .tuple([
        u8,
        word(12),
        matching(/^[a-zA-Z%/]{1,8}$/, "a unit"),
        scale,
        i32,
        i32,
        between(0, GROUP_MAX),
      ])
      .transform(([index, name, unit, perCount, min, max, group]) => ({
        index,
        name,
        unit,
        perCount,
        min,
        max,
        group,
      })),
  ),
  end: bySchema(
    "host",
    "CHANNELS MANIFEST",
    z.tuple([between(1, 64), h32]).transform(([channels, manifest]) => ({ channels, manifest })),
  ),
  sample: {
    to: "host",
    grammar: "SEQ TICK STATUS CAUSE ACK AGE CONV GROUP VALUE ...",
    read: readSample,
  } satisfies MessageKind<NonNullable<ReturnType<typeof readSample>>>,
  offer: bySchema(
    "host",
    "arm|inject NUMBER BOOT ARMS",
    z
      .tuple([oneOf(PURPOSES), h32, u32, u32])
      .transform(([purpose, number, boot, arms]) => ({ purpose, number, boot, arms })),
  ),
  yes: bySchema("host", "VERB VALUE", accepted),
  no: bySchema(
    "host",
    "VERB REASON [DETAIL ...]",
    refused.transform(([verb, why, detail]) => ({ verb, reason: why, detail: detail ?? null })),
  ),
  curve: bySchema(
    "host",
    "I X Y COUNT CRC",
    z
      .tuple([u8, u16, u16, u8, h32])
      .transform(([i, x, y, count, crc]) => ({ i, x, y, count, crc })),
  ),
  counts: bySchema(
    "host",
    "GOOD CRC LONG FORM VERB REFUSED BARE WRITES UPTIME",
    z
      .tuple([u32, u32, u32, u32, u32, u32, u32, u32, u32])
      .transform(([good, crc, long, form, verb, refusals, bare, writes, uptime]) => ({
        good,
        crc,
        long,
        form,
        verb,
        refused: refusals,
        bare,
        writes,
        uptime,
      })),
  ),
  say: bySchema(
    "host",
    "TEXT ...",
    z.tuple([anything], anything).transform((words) => ({ text: words.join(" ") })),
  ),
} as const;

/** Every verb of both directions. The two sets are disjoint. */
export const MESSAGES = { ...toController, ...toHost } as const;
export type Verb = keyof typeof MESSAGES;
export const VERBS = Object.keys(MESSAGES) as readonly Verb[];

/** What a verb's fields mean, once read. */
export type FieldsOf<V extends Verb> = NonNullable<ReturnType<(typeof MESSAGES)[V]["read"]>>;

/** A whole line, verb and fields judged. */
export type Message = {
  [V in Verb]: { readonly kind: "message"; readonly verb: V; readonly fields: FieldsOf<V> };
}[Verb];
/** A line that a controller takes as an unchecked dark. */
export interface BareDark {
  readonly kind: "dark";
}
const BARE_DARK: BareDark = { kind: "dark" };

const isVerb = (text: string): text is Verb => Object.hasOwn(MESSAGES, text);

const judgeFrame = (frame: Frame, side: Side): Message | Broken => {
  const { verb, fields } = frame;
  if (!isVerb(verb) || MESSAGES[verb].to !== side) return brokenAs("verb");
  const read = MESSAGES[verb].read(fields);
  // The table pairs each verb with its own reader, which the compiler cannot see through the union.
  return read === null ? brokenAs("form") : ({ kind: "message", verb, fields: read } as Message);
};

/**
 * Judges one received line (without its end) as that side does: a message, the first kind of
 * broken that fits, or for a controller an unchecked dark. Never throws.
 */
export const readLine = (line: string, side: Side): Message | Broken | BareDark => {
  const frame = openFrame(line, side);
  const judged = frame.kind === "frame" ? judgeFrame(frame, side) : frame;
  if (side === "host" || (judged.kind === "message" && judged.verb === "dark")) return judged;
  return looksDark(line) ? BARE_DARK : judged;
};
