import { type Problem, pathWords } from "./problem.ts";

/** Largest bench file read. A long one has a few kilobytes; the rest is not a bench file. */
export const BENCH_BYTES_MAX = 1_048_576;

export interface Place {
  readonly line: number;
  readonly column: number;
}

/** Line and column, both from 1, of an offset into the text. Offsets past the end mean the end. */
export function placeAt(text: string, offset: number): Place {
  const end = Math.max(0, Math.min(offset, text.length));
  let line = 1;
  let start = 0;
  for (let at = text.indexOf("\n"); at !== -1 && at < end; at = text.indexOf("\n", at + 1)) {
    line += 1;
    start = at + 1;
  }
  return { line, column: end - start + 1 };
}

/** Why the text cannot be a bench file at all, judged before any parsing; null where it may be. */
export function refuseText(text: string): Problem | null {
  if (text.length > BENCH_BYTES_MAX) {
    return wholeFile("too-large", 0, text, {
      found: `${text.length} characters`,
      wanted: `a bench file of at most ${BENCH_BYTES_MAX} bytes`,
      do: "check that this is the bench file and not a recording",
    });
  }
  const strange = findControl(text);
  if (strange !== -1) {
    const code = text.charCodeAt(strange).toString(16).toUpperCase().padStart(4, "0");
    return wholeFile("binary", strange, text, {
      found: code === "FFFD" ? "bytes that are not UTF-8" : `the control character U+${code}`,
      wanted: "plain text in UTF-8",
      do: "check that this is the bench file, and save it as UTF-8 text",
    });
  }
  if (text.trim() === "") {
    return wholeFile("empty", 0, text, {
      found: "an empty file",
      wanted: "a bench file",
      do: "begin from one of the bench files that come with the program",
    });
  }
  return null;
}

/** Offset of the first character that no text file has: controls but tab and line ends, or U+FFFD. */
function findControl(text: string): number {
  for (let at = 0; at < text.length; at += 1) {
    const code = text.charCodeAt(at);
    const control = (code < 32 && code !== 9 && code !== 10 && code !== 13) || code === 127;
    if (control || code === 0xfffd) return at;
  }
  return -1;
}

function wholeFile(
  code: string,
  offset: number,
  text: string,
  words: { found: string; wanted: string; do: string },
): Problem {
  return { level: "error", code, path: pathWords([]), ...placeAt(text, offset), ...words };
}
