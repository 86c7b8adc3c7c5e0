import type { z } from "zod";
import type { Bench } from "../model/bench.ts";
import type { Measured } from "./lints/link.ts";
import { lintBench } from "./lints.ts";
import { nearest } from "./near.ts";
import { type Finding, type Path, type Problem, pathWords } from "./problem.ts";
import { fileSchema } from "./schema.ts";
import { placeAt, refuseText } from "./text.ts";
import { toBench } from "./to-bench.ts";
import { type Read, readTree } from "./tree.ts";

export { BENCH_BYTES_MAX } from "./text.ts";

export type Parsed =
  /** `problems` holds warnings only. */
  | { readonly ok: true; readonly bench: Bench; readonly problems: readonly Problem[] }
  | { readonly ok: false; readonly problems: readonly Problem[] };

const UNMEASURED: Measured = { permitAge_ms: null };

/**
 * The bench a file describes, or everything wrong with it at once, each with its line and column.
 * Never throws, whatever the text. The caller reads the file; one over BENCH_BYTES_MAX is refused
 * here too, but is better not read at all.
 */
export function parseBench(text: string, measured: Measured = UNMEASURED): Parsed {
  const plain = text.startsWith("\ufeff") ? text.slice(1) : text;
  const refused = refuseText(plain);
  if (refused !== null) return { ok: false, problems: [refused] };
  const read = readTree(plain);
  if (read.tree === null) return { ok: false, problems: inOrder(read.problems) };

  const result = fileSchema.safeParse(read.tree, { reportInput: true });
  if (!result.success) {
    const findings = result.error.issues.flatMap((issue) => findingsOf(issue));
    return { ok: false, problems: inOrder(findings.map((finding) => place(plain, read, finding))) };
  }
  const { bench, findings } = toBench(result.data);
  const all = findings.length > 0 ? findings : lintBench(bench, measured);
  const problems = inOrder(all.map((finding) => place(plain, read, finding)));
  if (problems.some((problem) => problem.level === "error")) return { ok: false, problems };
  return { ok: true, bench: deepFreeze(bench), problems };
}

function place(text: string, read: Read, finding: Finding): Problem {
  const { level, code, path, found, wanted } = finding;
  const where = placeAt(text, read.offsetOf(path, code === "unknown-key" ? "key" : "value"));
  return { level, code, path: pathWords(path), ...where, found, wanted, do: finding.do };
}

const inOrder = (problems: readonly Problem[]): Problem[] =>
  [...problems].sort((a, b) => a.line - b.line || a.column - b.column);

/** What zod found, in our words. A custom issue carries them; the others are shapes and keys. */
function findingsOf(issue: z.core.$ZodIssue): Finding[] {
  const path = issue.path.filter((step) => typeof step !== "symbol");
  const error = (
    code: string,
    at: Path,
    found: string,
    wanted: string,
    advice: string,
  ): Finding => ({
    level: "error",
    code,
    path: at,
    found,
    wanted,
    do: advice,
  });
  if (issue.code === "custom") {
    const { code, found, wanted } = issue.params as Record<string, string>;
    return [error(code ?? "value", path, found ?? "", wanted ?? "", issue.message)];
  }
  if (issue.code === "unrecognized_keys") {
    const legal = issue.message.split(" ");
    return issue.keys.map((key) => {
      const near = nearest(key, legal);
      const advice = near === null ? "take it out" : `did you mean ${near}?`;
      const wanted = `one of the keys ${legal.join(", ")}`;
      return error("unknown-key", [...path, key], `the key ${clip(key)}`, wanted, advice);
    });
  }
  if (issue.code === "too_small" || issue.code === "too_big") {
    const found = issue.code === "too_small" ? "too few points" : "too many points";
    return [error("points", path, found, "2 to 16 points", "add or take out points")];
  }
  const what = issue.message;
  const name = String(path[path.length - 1] ?? "bench");
  const missing = issue.input === undefined;
  return missing
    ? [error("missing", path, "nothing", what, `add ${name}`)]
    : [error("shape", path, "a value of another shape", what, `write ${what}`)];
}

const clip = (key: string): string => (key.length > 40 ? `${key.slice(0, 40)}…` : key);

function deepFreeze<T>(value: T): T {
  if (typeof value === "object" && value !== null && !Object.isFrozen(value)) {
    Object.freeze(value);
    for (const part of Object.values(value)) deepFreeze(part);
  }
  return value;
}
