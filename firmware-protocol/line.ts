import { crc16Text, hex16 } from "./crc.ts";

/** Longest line before its end. Both sides drop what is longer. */
export const LINE_BYTES_MAX = 160;
/** Space and four digits that close a line. */
const TAIL_BYTES = 5;

/** Who receives a line. */
export type Side = "controller" | "host";

/** Ways a line can be broken, in the order in which they are judged: the first that fits names it. */
const BROKEN_KINDS = ["empty", "long", "char", "direction", "crc", "verb", "form"] as const;
export type BrokenKind = (typeof BROKEN_KINDS)[number];

/** A line whose checksum fits, cut at its spaces. Whether verb and fields make sense is not judged. */
export interface Frame {
  readonly kind: "frame";
  readonly verb: string;
  readonly fields: readonly string[];
}

export interface Broken {
  readonly kind: "broken";
  readonly broken: BrokenKind;
}

const BROKEN: Readonly<Record<BrokenKind, Broken>> = {
  empty: { kind: "broken", broken: "empty" },
  long: { kind: "broken", broken: "long" },
  char: { kind: "broken", broken: "char" },
  direction: { kind: "broken", broken: "direction" },
  crc: { kind: "broken", broken: "crc" },
  verb: { kind: "broken", broken: "verb" },
  form: { kind: "broken", broken: "form" },
};
export const brokenAs = (kind: BrokenKind): Broken => BROKEN[kind];

/**
 * Closes a body (`>who 1`) with its checksum: `>who 1 XXXX`, without a line end.
 * Throws where the result would not be a legal line: that is a defect of the caller.
 */
export const seal = (body: string): string => {
  const line = `${body} ${hex16(crc16Text(body))}`;
  if (line.length > LINE_BYTES_MAX) {
    throw new Error(`a line of ${line.length} bytes was made; ${LINE_BYTES_MAX} is the most`);
  }
  for (let i = 0; i < body.length; i += 1) {
    const code = body.charCodeAt(i);
    if (code < 0x20 || code > 0x7e) {
      throw new Error(
        `a line with byte 0x${code.toString(16)} was made; printable ASCII is wanted`,
      );
    }
  }
  return line;
};

/** The line up to, not including, the space before its checksum. */
export const bodyOf = (line: string): string => line.slice(0, -TAIL_BYTES);

const hexDigit = (code: number): number => {
  if (code >= 0x30 && code <= 0x39) return code - 0x30;
  if (code >= 0x41 && code <= 0x46) return code - 0x37;
  return -1;
};

/**
 * Judges a received line, without its end, up to its checksum: `empty`, `long`, `char`,
 * `direction`, `crc`, or null where all of them pass. Allocates nothing.
 */
export const checkLine = (line: string, side: Side): BrokenKind | null => {
  const length = line.length;
  if (length === 0) return "empty";
  if (length > LINE_BYTES_MAX) return "long";
  for (let i = 0; i < length; i += 1) {
    const code = line.charCodeAt(i);
    if (code < 0x20 || code > 0x7e) return "char";
  }
  if (line.charCodeAt(0) !== (side === "controller" ? 0x3e : 0x3c)) return "direction";
  const end = length - TAIL_BYTES;
  if (end < 1 || line.charCodeAt(end) !== 0x20) return "crc";
  let told = 0;
  for (let i = end + 1; i < length; i += 1) {
    const digit = hexDigit(line.charCodeAt(i));
    if (digit < 0) return "crc";
    told = (told << 4) | digit;
  }
  return told === crc16Text(line, 0, end) ? null : "crc";
};

/** `checkLine`, then verb and fields cut apart at single spaces (a double space leaves an empty field). */
export const openFrame = (line: string, side: Side): Frame | Broken => {
  const broken = checkLine(line, side);
  if (broken !== null) return brokenAs(broken);
  const parts = bodyOf(line).slice(1).split(" ");
  return { kind: "frame", verb: parts[0] ?? "", fields: parts.slice(1) };
};

/**
 * Whether a controller takes this line as an unchecked dark: it begins with `dark` or `>dark` in
 * any letter case, or three bytes 0x18 stand in it in a row. Asked only after the good line failed.
 */
export const looksDark = (line: string): boolean =>
  /^>?dark/i.test(line) || line.includes("\u0018\u0018\u0018");
