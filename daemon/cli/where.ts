import {
  chmodSync,
  existsSync,
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
  socket: z.string(),
  page: z.string(),
  darkPort: z.number(),
  folder: z.string(),
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
  // The folder's mode is the switch's authentication, so it is set even where the folder was there.
  chmodSync(folder, 0o700);
  return folder;
}

/** Folder where a bench's record is kept unless `--data` says otherwise. */
export function dataFolder(bench: string): string {
  const given = process.env.XDG_DATA_HOME;
  const base = given !== undefined && given !== "" ? given : join(homedir(), ".local", "share");
  return join(base, "beamsitter", bench);
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

/** Whether a process of that number lives. */
export function isAlive(pid: number): boolean {
  try {
    process.kill(pid, 0);
    return true;
  } catch {
    return false;
  }
}

/** The daemon meant: by `--on`, or the only one there is. Throws a Trouble that names the choice. */
export function pickNotice(on: string | undefined): Notice {
  const alive = notices().filter((n) => isAlive(n.pid) && existsSync(n.socket));
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
