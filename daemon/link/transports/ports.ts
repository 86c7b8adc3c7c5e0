import { constants } from "node:fs";
import { access, readdir, readFile, readlink, realpath, stat } from "node:fs/promises";
import { join } from "node:path";
import { SerialPort } from "serialport";

/** One serial port of this computer. */
export interface PortInfo {
  readonly path: string;
  /** What hangs on it, as the system tells; empty where it does not. */
  readonly description: string;
  /** What stands in the way of using it, in words; empty where nothing is known to. */
  readonly problem: string;
}

/** Device names that are serial ports where nothing else tells. */
const SERIAL_NAMES = /^(tty(USB|ACM|AMA|XRUSB|THS|GS)\d+|cu\..+|rfcomm\d+)$/;

/**
 * Group that owns a file, by name, or its number where it has none.
 * Only called after a failure, so reading two small files is no matter.
 */
export const groupName = async (path: string): Promise<string> => {
  const info = await stat(path).catch(() => null);
  if (info === null) return "dialout";
  const groups = await readFile("/etc/group", "utf8").catch(() => "");
  const line = groups.split("\n").find((l) => l.split(":")[2] === String(info.gid));
  return line?.split(":")[0] ?? String(info.gid);
};

const processName = async (pid: string): Promise<string> => {
  const name = await readFile(`/proc/${pid}/comm`, "utf8").catch(() => "");
  return name === "" ? `process ${pid}` : `${name.trim()}, process ${pid}`;
};

/** Process that holds a lock on the device file, from the kernel's list of locks; empty for none. */
const locker = async (path: string): Promise<string> => {
  const info = await stat(path).catch(() => null);
  const locks = await readFile("/proc/locks", "utf8").catch(() => "");
  if (info === null) return "";
  const held = locks.split("\n").find((l) => /FLOCK/.test(l) && l.includes(`:${info.ino} `));
  return held === undefined ? "" : (/(?:WRITE|READ)\s+(\d+)/.exec(held)?.[1] ?? "");
};

/** Process that has the device open, among those that this user may look into; empty for none. */
const opener = async (path: string): Promise<string> => {
  const target = await realpath(path).catch(() => path);
  const pids = (await readdir("/proc").catch(() => [])).filter((name) => /^\d+$/.test(name));
  for (const pid of pids) {
    const folder = `/proc/${pid}/fd`;
    for (const fd of await readdir(folder).catch(() => [])) {
      const link = await readlink(join(folder, fd)).catch(() => "");
      if (link === target && pid !== String(process.pid)) return pid;
    }
  }
  return "";
};

/** Who uses a port, in words, without opening it: opening would reset many boards. */
export const ownerWords = async (path: string): Promise<string> => {
  const pid = (await locker(path)) || (await opener(path));
  return pid === "" ? "" : processName(pid);
};

const problemOf = async (path: string): Promise<string> => {
  const usable = await access(path, constants.R_OK | constants.W_OK).then(
    () => true,
    () => false,
  );
  if (!usable) {
    const group = await groupName(path);
    return `not allowed: join group ${group} (sudo usermod -aG ${group} "$USER", then sign in again)`;
  }
  const owner = await ownerWords(path);
  return owner === "" ? "" : `in use by ${owner}`;
};

/** Ports by the library, which needs udevadm on Linux; null where that is missing. */
const byLibrary = async (): Promise<Map<string, string> | null> => {
  try {
    const found = await SerialPort.list();
    return new Map(
      found.map((p) => [p.path, [p.manufacturer, p.serialNumber].filter(Boolean).join(" ")]),
    );
  } catch {
    // No udevadm on this machine: the device names tell enough, see `byName`.
    return null;
  }
};

/** Ports by the names of device files. */
const byName = async (folder: string): Promise<Map<string, string>> => {
  const names = await readdir(folder).catch(() => []);
  return new Map(names.filter((n) => SERIAL_NAMES.test(n)).map((n) => [join(folder, n), ""]));
};

/**
 * Serial ports of this computer and what is wrong with each. Works without udevadm, opens none of
 * them, and never rejects. A port that is not listed can still be named in a bench file.
 */
export const listPorts = async (folder = "/dev"): Promise<PortInfo[]> => {
  const found = new Map([...(await byName(folder)), ...((await byLibrary()) ?? [])]);
  const paths = [...found.keys()].sort();
  return Promise.all(
    paths.map(async (path) => ({
      path,
      description: found.get(path) ?? "",
      problem: await problemOf(path),
    })),
  );
};
