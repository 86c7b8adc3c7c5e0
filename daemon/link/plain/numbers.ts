/** Numbers as strange firmware prints them. Nothing here throws, whatever the text. */

/** What boards print where they have no reading. */
export const NO_READING_PATTERN =
  "[+-]?nan|[+-]?inf(?:inity)?|ovf|over|open|short|err(?:or)?|null|n/?a|--+|\\?+".replace(
    /[a-z]/g,
    (letter) => `[${letter}${letter.toUpperCase()}]`,
  );
const NO_READING = new RegExp(`^(?:${NO_READING_PATTERN})$`);
/** A unit may stand behind a number, parted from it or not. */
const UNIT = "[A-Za-z°µμΩ%/]{0,8}";

const POINT = "[+-]?(?:\\d+(?:\\.\\d*)?|\\.\\d+)(?:[eE][+-]?\\d{1,3})?";
const COMMA = "[+-]?\\d+(?:,\\d+)?";

export type Decimals = "point" | "comma";

/** Pattern of a number with these decimals, without groups. */
export const numberPattern = (decimals: Decimals): string => (decimals === "point" ? POINT : COMMA);

const CELL: Readonly<Record<Decimals, RegExp>> = {
  point: new RegExp(`^(${POINT})\\s*(${UNIT})$`),
  comma: new RegExp(`^(${COMMA})\\s*(${UNIT})$`),
};

/** A printed value: a number with the unit behind it, no reading (NaN), or null for other text. */
export interface Printed {
  readonly value: number;
  readonly unit: string;
}

/** Reads one cell or value. "nan", "OPEN" and their like read as NaN; other text as null. */
export function readPrinted(text: string, decimals: Decimals): Printed | null {
  const plain = text.trim();
  const match = CELL[decimals].exec(plain);
  if (match === null) {
    return NO_READING.test(plain) ? { value: Number.NaN, unit: "" } : null;
  }
  return { value: Number((match[1] ?? "").replace(",", ".")), unit: match[2] ?? "" };
}

/** Characters that text may hold: printable, tabulator, and signs such as ° in either encoding. */
const CONTROL_MIN = 0x20;
const HIGH_MIN = 0x7f;
/** Bytes above 0x7e that a line may hold: a few degree and micro signs, each one or two bytes. */
const HIGH_COUNT_MAX = 8;

/** Whether a line is damaged: control characters, or more strange bytes than signs would make. */
export function isDamaged(line: string): boolean {
  let high = 0;
  for (let i = 0; i < line.length; i += 1) {
    const code = line.charCodeAt(i);
    if (code < CONTROL_MIN && code !== 9) return true;
    if (code >= HIGH_MIN) high += 1;
  }
  return high > HIGH_COUNT_MAX || high > line.length / 4;
}

/** Bytes of UTF-8 that came as single characters: the signs that stand in units, mended. */
export const mendSigns = (line: string): string =>
  line
    .replaceAll("\u00c2\u00b0", "°")
    .replaceAll("\u00c2\u00b5", "µ")
    .replaceAll("\u00ce\u00a9", "Ω");
