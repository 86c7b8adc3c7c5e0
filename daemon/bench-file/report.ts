import type { Problem } from "./problem.ts";

/** Most problems told at once; beyond them only their number. A torn file has thousands. */
export const PROBLEMS_TOLD_MAX = 50;

/**
 * Problems as lines for a terminal, two a problem: where and what, then what to do.
 * `name` is how the person called the file, so that a terminal can open it at the place.
 */
export function problemLines(problems: readonly Problem[], name: string): string[] {
  const lines: string[] = [];
  for (const problem of problems.slice(0, PROBLEMS_TOLD_MAX)) {
    const { line, column, level, path, found, wanted } = problem;
    const subject = path === "" ? "" : `  ${path}`;
    lines.push(`${name}:${line}:${column}  ${level}${subject}  found ${found}; wanted ${wanted}`);
    lines.push(`    ${problem.do}`);
  }
  const rest = problems.length - PROBLEMS_TOLD_MAX;
  if (rest > 0) lines.push(`${name}  and ${rest} more`);
  return lines;
}
