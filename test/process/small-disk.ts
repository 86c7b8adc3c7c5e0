import { spawnSync } from "node:child_process";
import { mkdtempSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";

/** A disk of 4 MiB of our own; null where this user may not mount one. */
export function smallDisk(): string | null {
  const at = mkdtempSync(join(tmpdir(), "beamsitter-disk-"));
  if (spawnSync("mount", ["-t", "tmpfs", "-o", "size=4m", "tmpfs", at]).status === 0) return at;
  rmSync(at, { recursive: true });
  return null;
}

export function unmount(disk: string): void {
  spawnSync("umount", ["-l", disk]);
  rmSync(disk, { recursive: true });
}
