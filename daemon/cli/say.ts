import type { z } from "zod";

/** Exit codes of every command, as `--help` tells them. */
export const EXIT = {
  done: 0,
  /** The judge refused, or `check` found an error: nothing was changed. */
  refused: 1,
  /** The command line itself was off. */
  usage: 2,
  /** No daemon answers for this bench. */
  absent: 3,
  /** Something outside stood in the way: a port, a folder, a file. */
  outside: 4,
} as const;

/** A trouble with its remedy: printed as two lines, never as a stack. */
export class Trouble extends Error {
  readonly remedy: string;
  readonly exit: number;
  constructor(found: string, remedy: string, exit: number = EXIT.outside) {
    super(found);
    this.remedy = remedy;
    this.exit = exit;
  }
}

/** One line to a person, broken between words where a terminal is narrower. */
export const print = (line: string): void => {
  process.stdout.write(`${wrapped(line, terminalColumns(), "")}\n`);
};

/** Narrower terminals than this break lines as they like. */
const COLUMNS_MIN = 40;

/** Width of the terminal; Infinity where output goes elsewhere. */
export function terminalColumns(): number {
  const { isTTY, columns } = process.stdout;
  return isTTY && columns >= COLUMNS_MIN ? columns : Number.POSITIVE_INFINITY;
}

/** Breaks a line between words; what follows a break begins with `indent`. */
export function wrapped(line: string, columns: number, indent: string): string {
  if (line.length <= columns) return line;
  const lines: string[] = [];
  let rest = line;
  while (rest.length > columns) {
    const at = rest.lastIndexOf(" ", columns);
    // A word longer than the terminal, such as an address, stays whole.
    if (at <= indent.length) break;
    lines.push(rest.slice(0, at));
    rest = `${indent}${rest.slice(at + 1)}`;
  }
  return [...lines, rest].join("\n");
}

/** One JSON document on stdout, through the schema that describes it. */
export const printJson = <S extends z.ZodType>(schema: S, value: z.input<S>): void => {
  process.stdout.write(`${JSON.stringify(schema.parse(value), null, 2)}\n`);
};

/** One JSON object a line, through the schema that describes it. */
export const jsonLine = <S extends z.ZodType>(schema: S, value: z.input<S>): string =>
  JSON.stringify(schema.parse(value));

/** A line about work going on; to stderr, and only where a person watches. */
export const progress = (line: string): void => {
  if (process.stderr.isTTY) process.stderr.write(`\r\u001b[2K${line}`);
};

/** The reason inside an unknown error, in its own words. */
export const reasonOf = (error: unknown): string =>
  error instanceof Error ? error.message : String(error);

/** The system's code of an error (`EACCES`), or an empty text. */
export const codeOf = (error: unknown): string => {
  const code = (error as { code?: unknown } | null)?.code;
  return typeof code === "string" ? code : "";
};

/** How a latched bench comes back, for a person at a terminal. */
export const resetWords = (bench: string, cause: string): string =>
  `When the cause is found and mended: beamsitter reset ${cause} --on ${bench}`;
