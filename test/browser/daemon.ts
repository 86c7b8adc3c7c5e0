import { type ChildProcess, spawn } from "node:child_process";
import { mkdtempSync, readFileSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { SwitchClient } from "../../daemon/control/client.ts";
import { builtFile } from "../../daemon/paths.ts";

const START_ms_MAX = 60_000;
const STOP_ms_MAX = 10_000;

/** A real daemon on its built-in bench, in folders of its own. */
export interface RunningDaemon {
  /** Address that signs one page in. */
  readonly address: string;
  readonly origin: string;
  readonly darkPort: number;
  readonly folder: string;
  connect(): Promise<SwitchClient>;
  /** Process ids of the desk, found among the daemon's children. */
  deskPid(): number;
  stop(): Promise<void>;
}

/** Runs the daemon from dist/ and waits for the line with its address. */
export async function startDaemon(...options: string[]): Promise<RunningDaemon> {
  const home = mkdtempSync(join(tmpdir(), "beamsitter-browser-"));
  const folder = join(home, "record");
  const child = spawn(
    process.execPath,
    [
      builtFile("daemon/cli/main.js").pathname,
      ...["run", "--port", "0", "--data", folder, ...options],
    ],
    {
      stdio: ["ignore", "pipe", "pipe"],
      env: { ...process.env, XDG_RUNTIME_DIR: home, XDG_DATA_HOME: home },
    },
  );
  const address = await addressFrom(child);
  const notice = JSON.parse(readFileSync(join(home, "beamsitter", "north.json"), "utf8")) as {
    socket: string;
    darkPort: number;
  };
  return {
    address,
    origin: new URL(address).origin,
    darkPort: notice.darkPort,
    folder,
    connect: () => SwitchClient.connect(notice.socket),
    deskPid: () => childOf(child.pid ?? 0, "desk/process.js"),
    async stop() {
      await ended(child);
      rmSync(home, { recursive: true, force: true });
    },
  };
}

function addressFrom(child: ChildProcess): Promise<string> {
  return new Promise((resolve, reject) => {
    let said = "";
    const timer = setTimeout(
      () => reject(new Error(`no address within ${START_ms_MAX} ms; it said: ${said}`)),
      START_ms_MAX,
    );
    const hear = (chunk: Buffer): void => {
      said += chunk;
      const address = /http:\/\/\S+sign\?code=\S+/.exec(said)?.[0];
      if (address === undefined) return;
      clearTimeout(timer);
      resolve(address);
    };
    child.stdout?.on("data", hear);
    child.stderr?.on("data", hear);
    child.on("exit", (code) => reject(new Error(`the daemon ended with ${code}: ${said}`)));
  });
}

/** The child process of `parent` whose command line holds `part`. */
function childOf(parent: number, part: string): number {
  const children = readFileSync(`/proc/${parent}/task/${parent}/children`, "utf8");
  for (const pid of children.split(" ").filter((text) => text !== "")) {
    if (readFileSync(`/proc/${pid}/cmdline`, "utf8").includes(part)) return Number(pid);
  }
  throw new Error(`process ${parent} has no child running ${part}`);
}

function ended(child: ChildProcess): Promise<void> {
  return new Promise((resolve) => {
    if (child.exitCode !== null || child.signalCode !== null) return resolve();
    const timer = setTimeout(() => child.kill("SIGKILL"), STOP_ms_MAX);
    child.on("exit", () => {
      clearTimeout(timer);
      resolve();
    });
    child.kill("SIGTERM");
  });
}
