import { existsSync } from "node:fs";
import { describe, expect, test } from "vitest";
import { packageRoot } from "../../daemon/paths.ts";
import { importsOf, packageOf } from "./imports.ts";
import { readSource, type Source } from "./sources.ts";

/** All that the thread which judges may load. No disk, no database, no web framework, no sender. */
const ALLOWED = new Set([
  "serialport",
  "@serialport/parser-readline",
  "node:net",
  "node:http",
  "node:worker_threads",
  "node:child_process",
]);
/** Parsers without I/O, for requests that come in over the switch. */
const PURE_PACKAGES = new Set(["zod"]);

/** Everything that is loaded when `entry` is: outside names with the file that wants them. */
function loadedFrom(entry: string, read: (path: string) => Source): Map<string, string> {
  const outside = new Map<string, string>();
  const seen = new Set<string>();
  const pending = [entry];
  for (let path = pending.pop(); path !== undefined; path = pending.pop()) {
    if (seen.has(path)) continue;
    seen.add(path);
    for (const { to, typeOnly } of importsOf(read(path))) {
      if (typeOnly) continue;
      if (/^(daemon|firmware-protocol|dashboards|test)\//.test(to)) pending.push(to);
      else outside.set(packageOf(to), path);
    }
  }
  return outside;
}

const forbidden = (outside: Map<string, string>): string[] =>
  [...outside]
    .filter(([name]) => !ALLOWED.has(name) && !PURE_PACKAGES.has(name))
    .map(([name, path]) => `${path} loads ${name} on the judging thread`);

describe("the judging thread", () => {
  test("daemon/supervise.ts is there", () => {
    expect(existsSync(`${packageRoot}/daemon/supervise.ts`)).toBe(true);
  });

  test("loads nothing but ports, sockets, workers and processes", () => {
    expect(forbidden(loadedFrom("daemon/supervise.ts", readSource))).toEqual([]);
  });

  test("a planted disk access two files away is caught", () => {
    const files: Record<string, string> = {
      "daemon/supervise.ts": 'import { a } from "./a.ts"; import type { Z } from "node:zlib";',
      "daemon/a.ts": 'export * from "./b/c.ts"; import net from "node:net";',
      "daemon/b/c.ts": 'import { open } from "node:fs/promises";',
    };
    const read = (path: string): Source => ({ path, text: files[path] ?? "" });
    expect(forbidden(loadedFrom("daemon/supervise.ts", read))).toEqual([
      "daemon/b/c.ts loads node:fs/promises on the judging thread",
    ]);
  });
});
