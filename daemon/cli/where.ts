import {
  chmodSync,
  existsSync,
  lstatSync,
  mkdirSync,
  readdirSync,
  readFileSync,
  rmSync,
  writeFileSync,
} from "node:fs";
import { homedir, tmpdir, userInfo } from "node:os";
import { join } from "node:path";
import { z } from "zod";
import { SwitchClient } from "../control/client.ts";
import { EXIT, reasonOf, Trouble } from "./say.ts";

/** What a running daemon leaves for its clients to find. */
const Notice = z.object({
  bench: z.string(),
  pid: z.number(),
  /** When that process began, as the system counts it: numbers of processes are used again. */
  began: z.string(),
  socket: z.string(),
  page: z.string(),
  darkPort: z.number(),
  folder: z.string(),
  /** Serial port of its controller; empty where it has none. */
  port: z.string().default(""),
  /** Whether its light ends with the daemon; a bench that is merely watched goes on. */
  endsLight: z.boolean().default(true),
});
export type Notice = z.infer<typeof Notice>;

/** Folder of sockets and notices: the user's own, readable by nobody else. */
export function runtimeFolder(): string {
  const given = process.env.XDG_RUNTIME_DIR;
  const folder =
    given !== undefined && given !== ""
      ? join(given, "beamsitter")
      : join(tmpdir(), `beamsitter-${userInfo().uid}`);
  mkdirSync(folder, { recursive: true, mode: 0o700 });
  // In a place that all may write to, somebody else may have put it there, or a link in its stead:
  // they could then hang up a switch of their own, and a dark would go to it.
  const found = lstatSync(folder);
  if (!found.isDirectory() || found.uid !== userInfo().uid) {
    throw new Trouble(
      `${folder}, where the switch belongs, is ${found.isDirectory() ? `a folder of user ${found.uid}` : "no folder but a link or a file"}.`,
      "Have it removed, or set XDG_RUNTIME_DIR to a folder of your own.",
    );
  }
  // The folder's mode is the switch's authentication, so it is set even where the folder was there.
  chmodSync(folder, 0o700);
  return folder;
}

/** Folder of all records that `--data` did not put elsewhere. */
function recordsFolder(): string {
  const given = process.env.XDG_DATA_HOME;
  const base = given !== undefined && given !== "" ? given : join(homedir(), ".local", "share");
  return join(base, "beamsitter");
}

/** Folder where a bench's record is kept unless `--data` says otherwise. */
export const dataFolder = (bench: string): string => join(recordsFolder(), bench);

/**
 * Folder of the record meant: that of the running daemon, else the usual one of that bench; without
 * a name, of the only bench there is. Throws a Trouble that names the choice.
 */
export function recordFolder(on: string | undefined): string {
  const running = notices().filter(lives);
  const kept = existsSync(recordsFolder()) ? readdirSync(recordsFolder()) : [];
  const names = [...new Set([...running.map((n) => n.bench), ...kept])].sort();
  const name = on ?? (names.length === 1 ? names[0] : undefined);
  if (name !== undefined && names.includes(name)) {
    return running.find((n) => n.bench === name)?.folder ?? dataFolder(name);
  }
  const there = names.length === 0 ? "There is none yet." : `There are: ${names.join(", ")}.`;
  throw new Trouble(
    on === undefined && names.length > 1
      ? "Several benches have a record here."
      : `There is no record of ${on === undefined ? "any bench" : `a bench named "${on}"`} in ${recordsFolder()}.`,
    `${there} Say which with --on NAME, or name its folder with --data.`,
    on === undefined && names.length > 1 ? EXIT.usage : EXIT.outside,
  );
}

/** The longest path a Unix socket may have on Linux is 107 bytes. */
const SOCKET_PATH_BYTES_MAX = 107;

export function socketPath(bench: string): string {
  const path = join(runtimeFolder(), `${bench}.socket`);
  if (Buffer.byteLength(path) > SOCKET_PATH_BYTES_MAX) {
    throw new Trouble(
      `The switch's path ${path} has ${Buffer.byteLength(path)} bytes; ${SOCKET_PATH_BYTES_MAX} are possible.`,
      "Set XDG_RUNTIME_DIR to a shorter folder.",
    );
  }
  return path;
}

/** The switch's path, free: a daemon that lives on it is named, a dead one's leavings are removed. */
export async function freeSocket(bench: string): Promise<string> {
  const path = socketPath(bench);
  const living = notices().find((n) => n.bench === bench && lives(n));
  if (living === undefined && !(await isListening(path))) {
    rmSync(path, { force: true });
    return path;
  }
  const which = living === undefined ? "" : ` (process ${living.pid})`;
  throw new Trouble(
    `A daemon already runs bench "${bench}"${which}.`,
    `Use it (beamsitter status --on ${bench}), or end it first with Ctrl-C where it runs. Nothing was started.`,
  );
}

/** Whether somebody listens: also a daemon that is just starting, or stands still. */
async function isListening(path: string): Promise<boolean> {
  try {
    (await SwitchClient.connect(path)).close();
    return true;
  } catch {
    // Nobody there, or only what a killed daemon left.
    return false;
  }
}

const noticePath = (bench: string): string => join(runtimeFolder(), `${bench}.json`);

export const writeNotice = (notice: Notice): void =>
  writeFileSync(noticePath(notice.bench), JSON.stringify(notice), { mode: 0o600 });

export const removeNotice = (bench: string): void => rmSync(noticePath(bench), { force: true });

/** Benches whose daemon left a notice, alive or not. */
export function notices(): Notice[] {
  const folder = runtimeFolder();
  return readdirSync(folder)
    .filter((name) => name.endsWith(".json"))
    .flatMap((name) => {
      const parsed = Notice.safeParse(readNotice(join(folder, name)));
      return parsed.success ? [parsed.data] : [];
    });
}

function readNotice(path: string): unknown {
  try {
    return JSON.parse(readFileSync(path, "utf8"));
  } catch {
    // A notice torn by a crash is no notice: its bench is found as absent.
    return null;
  }
}

/** Whether the daemon that left this notice lives: a process of its number that began when it did. */
export function lives(notice: Notice): boolean {
  try {
    process.kill(notice.pid, 0);
  } catch {
    // No such process, or somebody else's: a number that was ours is used again.
    return false;
  }
  return beganAt(notice.pid) === notice.began;
}

/** Clock ticks since boot at which a process began; empty where the system has no /proc. */
export function beganAt(pid: number): string {
  try {
    const stat = readFileSync(`/proc/${pid}/stat`, "latin1");
    // The second field is the program's name in brackets, which may hold spaces and brackets.
    return stat.slice(stat.lastIndexOf(")") + 2).split(" ")[19] ?? "";
  } catch {
    return "";
  }
}

/** The daemon meant: by `--on`, or the only one there is. Throws a Trouble that names the choice. */
export function pickNotice(on: string | undefined): Notice {
  const alive = notices().filter(lives);
  if (on !== undefined) {
    const found = alive.find((n) => n.bench === on);
    if (found !== undefined) return found;
    throw new Trouble(
      `No daemon runs for a bench named "${on}".`,
      alive.length > 0
        ? `Running now: ${alive.map((n) => n.bench).join(", ")}.`
        : "Start one: beamsitter run --bench FILE.",
      EXIT.absent,
    );
  }
  if (alive.length === 1 && alive[0] !== undefined) return alive[0];
  if (alive.length === 0) {
    throw new Trouble(
      "No daemon is running.",
      "Start one: npm start (built-in bench), or beamsitter run --bench FILE.",
      EXIT.absent,
    );
  }
  throw new Trouble(
    `Several benches run: ${alive.map((n) => n.bench).join(", ")}.`,
    "Say which: --on NAME.",
    EXIT.usage,
  );
}

/** Connects to the daemon meant. */
export async function reach(
  on: string | undefined,
): Promise<{ client: SwitchClient; notice: Notice }> {
  const notice = pickNotice(on);
  try {
    return { client: await SwitchClient.connect(notice.socket), notice };
  } catch (error) {
    throw new Trouble(
      `The daemon of ${notice.bench} (process ${notice.pid}) does not answer: ${reasonOf(error)}`,
      `Without its permits the board goes dark by itself. End it: beamsitter dark --on ${notice.bench}.`,
      EXIT.absent,
    );
  }
}
