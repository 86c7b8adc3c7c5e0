import { type ChildProcess, spawn, spawnSync } from "node:child_process";
import { existsSync, mkdtempSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { createInterface } from "node:readline";
import { setTimeout as pause } from "node:timers/promises";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { packageRoot } from "../../daemon/paths.ts";

/**
 * What a stranger does: clone, `npm start`, look, stop. Two things differ. What is tested is the
 * last commit, since that is what a clone holds. And node_modules is copied rather than installed
 * (as hard links where the file system allows): installing takes over a minute, and the stamp in it
 * is only right where lockfile, Node and processor are the same.
 */
const folder = mkdtempSync(join(tmpdir(), "beamsitter-clone-"));
const clone = join(folder, "checkout");

/** The clone's own world: no npm settings of the run around it, no data folder of this user. */
function environment(): NodeJS.ProcessEnv {
  const own = Object.entries(process.env).filter(
    ([name]) => !/^(npm_|INIT_CWD$|VITEST|NODE_ENV$|XDG_)/i.test(name),
  );
  return {
    ...Object.fromEntries(own),
    HOME: join(folder, "home"),
    XDG_RUNTIME_DIR: join(folder, "run"),
  };
}

function run(command: string, args: readonly string[], cwd: string): string {
  const result = spawnSync(command, args, { cwd, env: environment(), encoding: "utf8" });
  if (result.status === 0) return result.stdout;
  throw new Error(`${command} ${args.join(" ")} ended with ${result.status}: ${result.stderr}`);
}

function copyModules(): void {
  const [from, to] = [join(packageRoot, "node_modules"), join(clone, "node_modules")];
  const linked = spawnSync("cp", ["-al", from, to]);
  if (linked.status === 0) return;
  rmSync(to, { recursive: true, force: true });
  run("cp", ["-a", "--reflink=auto", from, to], folder);
}

/** Resolves to the page's address, once the daemon has printed it. */
function addressOf(daemon: ChildProcess): Promise<string> {
  return new Promise((resolve, reject) => {
    if (daemon.stdout === null) return reject(new Error("npm start has no stdout"));
    const lines = createInterface({ input: daemon.stdout });
    const seen: string[] = [];
    lines.on("line", (line) => {
      seen.push(line);
      const match = /its page: (http:\/\/127\.0\.0\.1:\d+\/\S*)/.exec(line);
      if (match?.[1] !== undefined) resolve(match[1]);
    });
    daemon.once("exit", (code) => {
      reject(new Error(`npm start ended with ${code} after printing:\n${seen.join("\n")}`));
    });
  });
}

const status = (): string => run(process.execPath, ["daemon/ready.mjs", "status", "--json"], clone);

describe("a fresh clone", () => {
  let daemon: ChildProcess | null = null;

  beforeAll(() => {
    run("mkdir", ["-m", "700", join(folder, "home"), join(folder, "run")], folder);
    run("git", ["clone", "--quiet", packageRoot, clone], folder);
    copyModules();
  });

  afterAll(() => {
    if (daemon?.pid !== undefined && daemon.exitCode === null) process.kill(-daemon.pid, "SIGKILL");
    rmSync(folder, { recursive: true, force: true });
  });

  test("starts, emits light on the built-in bench, and goes dark when it is stopped", async () => {
    // A free port, since somebody's own daemon may have the usual one.
    daemon = spawn("npm", ["start", "--", "--port", "0"], {
      cwd: clone,
      env: environment(),
      stdio: ["ignore", "pipe", "inherit"],
      // A group of its own, so that the signal reaches the daemon below npm.
      detached: true,
    });
    const ended = new Promise<number | null>((resolve) => daemon?.once("exit", resolve));

    const page = await addressOf(daemon);
    const answer = await fetch(page, { redirect: "manual" });
    expect(answer.status).toBeLessThan(400);

    while (!/"state":\s*"emitting"/.test(status())) await pause(250);

    process.kill(-(daemon.pid ?? 0), "SIGTERM");
    await ended;
    const left = spawnSync(process.execPath, ["daemon/ready.mjs", "status", "--json"], {
      cwd: clone,
      env: environment(),
      encoding: "utf8",
    });
    expect(left.stdout).not.toMatch(/"state":\s*"emitting"/);
  });

  test("leaves nothing in the checkout that git would list", () => {
    expect(existsSync(join(clone, "dist"))).toBe(true);
    expect(run("git", ["status", "--porcelain"], clone)).toBe("");
  });
});
