import { spawnSync } from "node:child_process";
import { existsSync, mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterAll, describe, expect, test } from "vitest";
import { withLock } from "../../../daemon/ready/lock.mjs";
import { NotReady } from "../../../daemon/ready/say.mjs";
import { checkNode, target } from "../../../daemon/ready.mjs";

const folder = mkdtempSync(join(tmpdir(), "beamsitter-lock-"));
afterAll(() => rmSync(folder, { recursive: true }));

describe("what ready.mjs becomes", () => {
  test.each([
    [["start"], ["run"]],
    [
      ["start", "--bench", "a b.yaml"],
      ["run", "--bench", "a b.yaml"],
    ],
    [
      ["demo", "--for", "8h", "--json"],
      ["demo", "--for", "8h", "--json"],
    ],
    [["--help"], ["--help"]],
    [[], []],
  ])("%j hands on %j", (given, args) => {
    expect(target(given)).toEqual({ file: "daemon/cli/main.js", args });
  });

  test("a program gets the arguments after its file", () => {
    expect(target(["program", "test/benchmarks/bench.js", "--json", "x"])).toEqual({
      file: "test/benchmarks/bench.js",
      args: ["--json", "x"],
    });
  });

  test("a program without a file is refused with an example", () => {
    expect(() => target(["program"])).toThrow(NotReady);
  });

  test("build becomes nothing", () => {
    expect(target(["build"])).toBeNull();
  });
});

describe("Node's version", () => {
  test.each(["18.20.0", "20.18.3", "19.9.0"])("%s is refused", (version) => {
    expect(() => checkNode(version)).toThrow(/20\.19 or later; this is Node/);
  });

  test.each(["20.19.0", "20.20.2", "22.0.0", "24.1.0"])("%s will do", (version) => {
    expect(() => checkNode(version)).not.toThrow();
  });
});

describe("the lock against two builds at once", () => {
  test("lets one in after the other", async () => {
    const lock = join(folder, "busy.lock");
    let inside = 0;
    let most = 0;
    const work = async () => {
      most = Math.max(most, ++inside);
      await new Promise((resolve) => setImmediate(resolve));
      inside--;
    };
    await Promise.all([withLock(work, lock), withLock(work, lock), withLock(work, lock)]);
    expect(most).toBe(1);
    expect(existsSync(lock)).toBe(false);
  });

  test("is given back when the work fails", async () => {
    const lock = join(folder, "failed.lock");
    const failing = withLock(() => Promise.reject(new Error("compiler")), lock);
    await expect(failing).rejects.toThrow("compiler");
    expect(existsSync(lock)).toBe(false);
  });

  test("of a process that is gone is taken away", async () => {
    const lock = join(folder, "stale.lock");
    const gone = spawnSync(process.execPath, ["-e", ""]).pid;
    writeFileSync(lock, String(gone));
    expect(await withLock(async () => "done", lock)).toBe("done");
  });
});
