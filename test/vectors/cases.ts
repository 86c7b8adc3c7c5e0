import { crc16Text, hex16 } from "../../firmware-protocol/crc.ts";
import type { BrokenKind, Side } from "../../firmware-protocol/line.ts";

/** One golden line, with the verdict that its author expects: written by hand, never computed. */
export interface Case {
  readonly name: string;
  readonly to: Side;
  readonly line: string;
  readonly verdict: "ok" | "dark" | BrokenKind;
  /** The verb that the line is, or tries to be. */
  readonly verb?: string;
  readonly fields?: Readonly<Record<string, unknown>>;
}

/** Closes a body with its checksum, whatever is in it. */
export const closed = (body: string): string => `${body} ${hex16(crc16Text(body))}`;

const verbOf = (body: string): string => /^[<>]([a-z]+)/.exec(body)?.[1] ?? "";

const tagged = (body: string): { verb?: string } => {
  const verb = verbOf(body);
  return verb === "" ? {} : { verb };
};

/** Makers of cases for one receiving side. */
export const casesTo = (to: Side) => ({
  /** A whole line with these fields. */
  ok: (name: string, body: string, fields: Readonly<Record<string, unknown>>): Case => ({
    name,
    to,
    line: closed(body),
    verdict: "ok",
    ...tagged(body),
    fields,
  }),
  /** A line with a good checksum that is broken otherwise. */
  bad: (name: string, body: string, verdict: Case["verdict"]): Case => ({
    name,
    to,
    line: closed(body),
    verdict,
    ...tagged(body),
  }),
  /** A line exactly as written here. */
  raw: (name: string, line: string, verdict: Case["verdict"]): Case => ({
    name,
    to,
    line,
    verdict,
    ...tagged(line),
  }),
});
