import { closeSync, fstatSync, openSync, readSync } from "node:fs";
import { BENCH_BYTES_MAX, parseBench } from "../bench-file/parse.ts";
import { problemLines } from "../bench-file/report.ts";
import type { Bench } from "../model/bench.ts";
import { assetFile } from "../paths.ts";
import { codeOf, EXIT, reasonOf, Trouble } from "./say.ts";

/** The built-in bench's own file. */
export const NORTH = assetFile("daemon/bench-file/benches/north.yaml");

/** Reads a bench file's text; a folder, a missing or a huge file is refused in words. */
export function readBenchText(path: string | URL): string {
  let handle: number;
  try {
    handle = openSync(path, "r");
  } catch (error) {
    throw new Trouble(
      whyUnreadable(String(path), error),
      "Name a readable bench file: --bench FILE.",
    );
  }
  try {
    const info = fstatSync(handle);
    if (info.isDirectory()) {
      throw new Trouble(`${path} is a folder.`, "Name the bench file in it: --bench FILE.");
    }
    if (info.size > BENCH_BYTES_MAX) {
      throw new Trouble(
        `${path} has ${info.size} bytes; a bench file has at most ${BENCH_BYTES_MAX}.`,
        "Name the bench file itself; recordings and pictures belong elsewhere.",
      );
    }
    const bytes = Buffer.alloc(BENCH_BYTES_MAX + 1);
    const read = readSync(handle, bytes, 0, bytes.length, 0);
    return bytes.toString("utf8", 0, read);
  } finally {
    closeSync(handle);
  }
}

function whyUnreadable(path: string, error: unknown): string {
  const code = codeOf(error);
  if (code === "ENOENT") return `There is no file ${path}.`;
  if (code === "EACCES") return `${path} may not be read by this user.`;
  return `${path} cannot be read: ${reasonOf(error)}.`;
}

/** The bench of a file, or a Trouble that lists everything wrong with it. */
export function loadBench(path: string | URL): { bench: Bench; text: string } {
  const text = readBenchText(path);
  const parsed = parseBench(text);
  if (parsed.ok) return { bench: parsed.bench, text };
  throw new Trouble(
    problemLines(parsed.problems, String(path)).join("\n"),
    `Mend the file, then: beamsitter check ${path}`,
    EXIT.refused,
  );
}
