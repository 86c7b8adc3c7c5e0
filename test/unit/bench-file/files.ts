import { readFileSync } from "node:fs";
import { parseBench } from "../../../daemon/bench-file/parse.ts";
import type { Problem } from "../../../daemon/bench-file/problem.ts";
import type { Bench } from "../../../daemon/model/bench.ts";

const read = (name: string): string =>
  readFileSync(new URL(`../../../daemon/bench-file/benches/${name}.yaml`, import.meta.url), "utf8");

/** The bench files that ship. */
export const NORTH = read("north");
export const BARE_DIODE = read("bare-diode");

/** The text with one passage changed; the passage must stand there exactly once. */
export function changed(text: string, from: string, to: string): string {
  if (text.split(from).length !== 2) throw new Error(`"${from}" does not stand there once`);
  return text.replace(from, () => to);
}

export function benchOf(text: string): Bench {
  const parsed = parseBench(text);
  if (!parsed.ok) throw new Error(JSON.stringify(parsed.problems));
  return parsed.bench;
}

/** The problem of that code, or undefined. */
export const problemOf = (text: string, code: string): Problem | undefined =>
  parseBench(text).problems.find((problem) => problem.code === code);
