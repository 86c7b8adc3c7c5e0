import { mkdirSync, mkdtempSync, rmSync, statSync, symlinkSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterEach, beforeEach, expect, test } from "vitest";
import { runtimeFolder } from "../../../daemon/cli/where.ts";

let base = "";
const before = process.env.XDG_RUNTIME_DIR;

beforeEach(() => {
  base = mkdtempSync(join(tmpdir(), "beamsitter-where-"));
  process.env.XDG_RUNTIME_DIR = base;
});

afterEach(() => {
  if (before === undefined) delete process.env.XDG_RUNTIME_DIR;
  else process.env.XDG_RUNTIME_DIR = before;
  rmSync(base, { recursive: true });
});

test("the folder of the switch is readable by its owner alone, also where it was there before", () => {
  mkdirSync(join(base, "beamsitter"), { mode: 0o777 });
  const folder = runtimeFolder();
  expect(folder).toBe(join(base, "beamsitter"));
  expect(statSync(folder).mode & 0o777).toBe(0o700);
});

test("a link in its stead is refused in words: somebody's own switch could hang there", () => {
  mkdirSync(join(base, "elsewhere"), { mode: 0o755 });
  symlinkSync(join(base, "elsewhere"), join(base, "beamsitter"));
  expect(() => runtimeFolder()).toThrow(/no folder but a link/);
  expect(statSync(join(base, "elsewhere")).mode & 0o777).toBe(0o755);
});
