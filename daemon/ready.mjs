#!/usr/bin/env node
/**
 * Makes this checkout ready, then becomes the program that was asked for.
 *
 *   node daemon/ready.mjs start [options]        the daemon, on the built-in bench or --bench FILE
 *   node daemon/ready.mjs build                  install and build only
 *   node daemon/ready.mjs program FILE [args]    a program of this checkout, named below dist/
 *   node daemon/ready.mjs COMMAND [args]         any command of beamsitter
 *
 * Uses node built-ins only, because it runs before anything is installed. It prints to stderr only:
 * stdout belongs to the program it becomes (`demo --json` is read by scripts). There is one process
 * throughout, so signals need no forwarding.
 */
import { existsSync, realpathSync } from "node:fs";
import { join } from "node:path";
import { fileURLToPath, pathToFileURL } from "node:url";
import { build } from "./ready/build.mjs";
import { install } from "./ready/install.mjs";
import { withLock } from "./ready/lock.mjs";
import { NotReady, root, say } from "./ready/say.mjs";

const ENTRY = "daemon/cli/main.js";

/** Refuses a node that is too old to run what follows. */
export function checkNode(version = process.versions.node) {
  const [major = 0, minor = 0] = version.split(".").map(Number);
  if (major > 20 || (major === 20 && minor >= 19)) return;
  throw new NotReady(
    `beamsitter needs Node 20.19 or later; this is Node ${version}.`,
    "Install a newer Node (nodejs.org, or your system's packages) and run the same command again.",
  );
}

/** Installs and builds what is missing or out of date; returns at once where nothing is. */
export async function ready() {
  checkNode();
  if (install.isDone() && build.isDone()) return;
  await withLock(async () => {
    if (!install.isDone()) await install.run();
    if (!build.isDone()) await build.run();
  });
}

/** What to import, below dist/, and with which arguments. */
export function target([verb, ...rest]) {
  if (verb === "start") return { file: ENTRY, args: ["run", ...rest] };
  if (verb === "build") return null;
  if (verb !== "program") {
    return { file: ENTRY, args: verb === undefined ? [] : [verb, ...rest] };
  }
  const [file, ...args] = rest;
  if (file === undefined) {
    throw new NotReady(
      "`program` needs the file to run.",
      "Example: node daemon/ready.mjs program test/benchmarks/bench.js",
    );
  }
  return { file, args };
}

async function main() {
  const wanted = target(process.argv.slice(2));
  await ready();
  if (wanted === null) return;
  const file = join(root, "dist", wanted.file);
  if (!existsSync(file)) {
    throw new NotReady(
      `dist/${wanted.file} is not there after the build.`,
      "Name a file below dist/, with its ending .js; its source lies at the same path beside dist/.",
    );
  }
  process.argv = [process.execPath, file, ...wanted.args];
  await import(pathToFileURL(file).href);
}

const self = fileURLToPath(import.meta.url);
if (process.argv[1] !== undefined && realpathSync(process.argv[1]) === self) {
  try {
    await main();
  } catch (error) {
    if (!(error instanceof NotReady)) throw error;
    say(error.message);
    say(error.remedy);
    process.exitCode = 1;
  }
}
