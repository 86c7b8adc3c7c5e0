import { type ChildProcess, spawn } from "node:child_process";
import { mkdirSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { createInterface } from "node:readline";
import { fileURLToPath } from "node:url";
import type { Snapshot } from "../../daemon/control/api.ts";
import { SwitchClient } from "../../daemon/control/client.ts";
import { builtFile } from "../../daemon/paths.ts";

/** The command line's entry as it was built. */
export const CLI = fileURLToPath(builtFile("daemon/cli/main.js"));

/** A place of its own for sockets, data and bench files, so that no test meets another's daemon. */
export class Place {
  readonly folder = mkdtempSync(join(tmpdir(), "bs-"));
  readonly env: NodeJS.ProcessEnv;

  constructor() {
    const run = join(this.folder, "run");
    mkdirSync(run, { mode: 0o700 });
    this.env = {
      ...process.env,
      XDG_RUNTIME_DIR: run,
      XDG_DATA_HOME: join(this.folder, "data"),
      // A test's daemon speaks to nobody else's terminal.
      NO_COLOR: "1",
    };
  }

  file(name: string, text: string): string {
    const path = join(this.folder, name);
    writeFileSync(path, text);
    return path;
  }

  remove(): void {
    rmSync(this.folder, { recursive: true, force: true });
  }
}

/** What a command line printed and how it ended. */
export interface Ended {
  readonly code: number | null;
  readonly stdout: string;
  readonly stderr: string;
}

/** Runs one command of the built command line to its end. */
export function runCli(place: Place, ...args: string[]): Promise<Ended> {
  return new Promise((resolve) => {
    const child = spawn(process.execPath, [CLI, ...args], { env: place.env });
    let stdout = "";
    let stderr = "";
    child.stdout.on("data", (text: Buffer) => {
      stdout += text.toString();
    });
    child.stderr.on("data", (text: Buffer) => {
      stderr += text.toString();
    });
    child.stdin.end();
    child.on("close", (code) => resolve({ code, stdout, stderr }));
  });
}

/** A daemon as a process of its own. */
export class Daemon {
  readonly child: ChildProcess;
  readonly place: Place;
  /** The page's address with its one-time code. */
  readonly address: string;
  readonly client: SwitchClient;

  private constructor(
    child: ChildProcess,
    place: Place,
    address: string,
    client: SwitchClient,
    bench: string,
  ) {
    this.child = child;
    this.place = place;
    this.address = address;
    this.client = client;
    const folder = join(place.env.XDG_RUNTIME_DIR ?? "", "beamsitter");
    this.notice = JSON.parse(readFileSync(join(folder, `${bench}.json`), "utf8"));
  }

  /** Starts `beamsitter run` with these arguments; resolves when it has printed its page's address. */
  static async start(place: Place, bench: string, ...args: string[]): Promise<Daemon> {
    const child = spawn(process.execPath, [CLI, "run", "--port", "0", ...args], { env: place.env });
    let stderr = "";
    child.stderr.on("data", (text: Buffer) => {
      stderr += text.toString();
    });
    const address = await new Promise<string>((resolve, reject) => {
      createInterface({ input: child.stdout }).on("line", (line) => {
        const found = /its page: (\S+)/.exec(line)?.[1];
        if (found !== undefined) resolve(found);
      });
      child.on("exit", (code) => reject(new Error(`the daemon ended with ${code}: ${stderr}`)));
    });
    const socket = join(place.env.XDG_RUNTIME_DIR ?? "", "beamsitter", `${bench}.socket`);
    return new Daemon(child, place, address, await SwitchClient.connect(socket), bench);
  }

  /** What the daemon left for its clients to find, as it was when the daemon had started. */
  readonly notice: { readonly darkPort: number; readonly pid: number; readonly page: string };

  get darkPort(): number {
    return this.notice.darkPort;
  }

  async snapshot(): Promise<Snapshot> {
    const { snapshot } = await this.client.ask({ verb: "status" });
    if (snapshot === undefined) throw new Error("the switch told no snapshot");
    return snapshot;
  }

  /** Resolves with the first snapshot that fits; the switch pushes them, nothing is polled. */
  async until(fits: (s: Snapshot) => boolean, within_ms: number): Promise<Snapshot> {
    let last: Snapshot | null = null;
    return new Promise((resolve, reject) => {
      const timer = setTimeout(
        () => reject(new Error(`not within ${within_ms} ms; last: ${JSON.stringify(last)}`)),
        within_ms,
      );
      const look = (s: Snapshot): void => {
        last = s;
        if (!fits(s)) return;
        clearTimeout(timer);
        resolve(s);
      };
      this.client
        .watch((push) => {
          if (push.push === "snapshot") look(push.snapshot);
        })
        .catch(reject);
    });
  }

  /** Sends a signal; resolves with the exit code when the process is gone. */
  signal(name: NodeJS.Signals): Promise<number | null> {
    return new Promise((resolve) => {
      if (this.child.exitCode !== null || this.child.signalCode !== null) {
        resolve(this.child.exitCode);
        return;
      }
      this.child.once("exit", (code) => resolve(code));
      this.child.kill(name);
    });
  }
}
