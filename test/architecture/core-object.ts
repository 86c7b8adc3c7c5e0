import { spawnSync } from "node:child_process";
import { readdirSync, readFileSync } from "node:fs";

/** Runs a compiler tool and returns what it printed. Throws with its messages where it fails. */
function tool(command: string, args: readonly string[], cwd: string): string {
  const { status, stdout, stderr, error } = spawnSync(command, args, { cwd, encoding: "utf8" });
  if (status === 0) return stdout;
  throw new Error(`${command} ${args.join(" ")}: ${error?.message ?? stderr}`);
}

/**
 * What the core's object for the AVR wants from outside, when these C files are linked together:
 * symbols that none of them defines. `folder` takes the objects.
 */
export function undefinedSymbols(files: readonly string[], folder: string): string[] {
  const flags = ["-mmcu=atmega328p", "-std=gnu99", "-ffreestanding", "-Os", "-c"];
  tool("avr-gcc", [...flags, ...files], folder);
  const objects = readdirSync(folder).filter((name) => name.endsWith(".o"));
  tool("avr-ld", ["-r", "-o", "whole.obj", ...objects], folder);
  const listed = tool("avr-nm", ["-u", "whole.obj"], folder);
  return [...listed.matchAll(/^\s+U (\S+)$/gm)].map((match) => match[1] ?? "");
}

/** Arithmetic that the AVR compiler calls rather than writes out, on integers only. */
const INTEGER_HELPER =
  /^__(u?(mul|div|mod|divmod)[a-z]*[0-9]*|[us]?mul[a-z0-9]+|mulsidi3|umulsidi3|muluhisi3|mulhisi3|mulshisi3|mulohisi3|ashl[a-z]+3|ashr[a-z]+3|lshr[a-z]+3|negsi2|cmpdi2|cmpdi2_s8|adddi3|adddi3_s8|subdi3|negdi2|tablejump2?__|prologue_saves__|epilogue_restores__|do_copy_data|do_clear_bss|load_[0-9]|xload_[0-9]|movmem[a-z]*)$/;

/** Symbols that a freestanding core without heap and floating point may not need. */
export const forbiddenSymbols = (names: readonly string[]): string[] =>
  names.filter(
    (name) =>
      /[sd]f[0-9]?|float|fix/.test(name) ||
      !(name === "memcpy" || name === "memset" || INTEGER_HELPER.test(name)),
  );

/**
 * Who calls whom in these C files, by name. A call through a pointer names nobody, so the one that
 * leads back into these files is given: `pointer.from` may call each of `pointer.to`.
 */
export function callsIn(
  files: readonly string[],
  folder: string,
  pointer?: { readonly from: string; readonly to: readonly string[] },
): Map<string, Set<string>> {
  tool("gcc", ["-std=c99", "-ffreestanding", "-O0", "-fcallgraph-info", "-c", ...files], folder);
  const calls = new Map<string, Set<string>>();
  if (pointer !== undefined) calls.set(pointer.from, new Set(pointer.to));
  for (const name of readdirSync(folder).filter((file) => file.endsWith(".ci"))) {
    const text = readFileSync(`${folder}/${name}`, "utf8");
    for (const [, from = "", to = ""] of text.matchAll(
      /edge: \{ sourcename: "([^"]+)" targetname: "([^"]+)"/g,
    )) {
      if (to === "__indirect_call") continue;
      calls.set(from, (calls.get(from) ?? new Set()).add(to));
    }
  }
  return calls;
}

/** Functions that can reach themselves. */
export function recursive(calls: ReadonlyMap<string, ReadonlySet<string>>): string[] {
  const reaches = (from: string): Set<string> => {
    const seen = new Set<string>();
    const pending = [...(calls.get(from) ?? [])];
    for (let next = pending.pop(); next !== undefined; next = pending.pop()) {
      if (seen.has(next)) continue;
      seen.add(next);
      pending.push(...(calls.get(next) ?? []));
    }
    return seen;
  };
  return [...calls.keys()].filter((name) => reaches(name).has(name));
}
