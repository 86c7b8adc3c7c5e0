import { linkSync, mkdirSync, readFileSync, renameSync, rmSync, writeFileSync } from "node:fs";
import { dirname, join } from "node:path";
import { setTimeout as pause } from "node:timers/promises";
import { root, say } from "./say.mjs";

const LOCK = join(root, ".beamsitter", "ready.lock");
const poll_ms = 250;

/**
 * Runs `work` while no other process installs or builds in this checkout; waits for one that does.
 * The lock is a file holding its owner's process id, linked into place whole, so it is never seen
 * half-written; one whose owner is gone is taken away.
 */
export async function withLock(work, lock = LOCK) {
  mkdirSync(dirname(lock), { recursive: true });
  let told = false;
  while (!take(lock)) {
    const owner = ownerOf(lock);
    if (owner !== null && !isAlive(owner)) removeStale(lock, owner);
    else if (!told && owner !== null) {
      say(`process ${owner} is installing or building here; waiting for it`);
      say(`if there is no such install or build, remove ${lock}`);
      told = true;
    }
    await pause(poll_ms);
  }
  try {
    return await work();
  } finally {
    rmSync(lock, { force: true });
  }
}

function take(lock) {
  const own = `${lock}.${process.pid}`;
  writeFileSync(own, String(process.pid));
  try {
    linkSync(own, lock);
    return true;
  } catch (error) {
    if (error.code === "EEXIST") return false;
    throw error;
  } finally {
    rmSync(own, { force: true });
  }
}

/** Process id in the lock, or null when it has just been given back. */
function ownerOf(lock) {
  try {
    return Number(readFileSync(lock, "utf8"));
  } catch (error) {
    if (error.code === "ENOENT") return null;
    throw error;
  }
}

function isAlive(pid) {
  try {
    process.kill(pid, 0);
    return true;
  } catch (error) {
    return error.code === "EPERM";
  }
}

/** Takes the dead owner's lock away; puts it back when somebody else took it a moment before. */
function removeStale(lock, owner) {
  const aside = `${lock}.stale.${process.pid}`;
  try {
    renameSync(lock, aside);
    if (ownerOf(aside) !== owner) linkSync(aside, lock);
  } catch (error) {
    if (error.code !== "ENOENT" && error.code !== "EEXIST") throw error;
  } finally {
    rmSync(aside, { force: true });
  }
}
