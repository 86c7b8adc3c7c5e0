import { type ChildProcess, fork } from "node:child_process";
import { randomBytes } from "node:crypto";
import { setPriority } from "node:os";
import { fileURLToPath } from "node:url";
import type { DeskConfig, FromDesk } from "../desk/config.ts";
import { builtFile } from "../paths.ts";
import { reasonOf } from "./say.ts";

/** A desk that has not told that it lives for this long is ended and started anew, ms. */
const SILENCE_ms_MAX = 5000;
/** Pause before a desk that ended is started again, ms: doubled each time until it listens. */
const AGAIN_ms_MIN = 500;
const AGAIN_ms_MAX = 30_000;
/** Less favoured than the judging thread by this much (nice). */
const NICE = 10;

/**
 * The desk as a child process: lower priority, killed and restarted when it hangs. What the judge
 * decides never waits for it.
 */
export class DeskProcess {
  #config: DeskConfig;
  readonly #onWords: (words: string) => void;
  #child: ChildProcess | null = null;
  #port: number;
  #heard_ms = 0;
  #ended = false;
  readonly #watch: NodeJS.Timeout;
  #again_ms = AGAIN_ms_MIN;
  /** What was told last; the same is not told again until the desk has listened. */
  #told = "";
  #ready: ((failed: string) => void)[] = [];

  constructor(config: DeskConfig, onWords: (words: string) => void) {
    this.#config = config;
    this.#port = config.port;
    this.#onWords = onWords;
    this.#start();
    this.#watch = setInterval(() => this.#look(), 1000);
  }

  /** Resolves when the desk listens, with nothing; or when it could not, with the reason. */
  listening(): Promise<string> {
    if (this.#heard_ms > 0) return Promise.resolve("");
    return new Promise((resolve) => this.#ready.push(resolve));
  }

  get port(): number {
    return this.#port;
  }

  get pid(): number {
    return this.#child?.pid ?? 0;
  }

  /** The address that signs a page in once, or null while no desk listens. */
  sign(): string | null {
    const child = this.#child;
    if (child === null || !child.connected || this.#heard_ms === 0) return null;
    const code = randomBytes(18).toString("base64url");
    child.send({ kind: "code", code });
    return `${this.address()}sign?code=${code}`;
  }

  address(): string {
    const given = this.#config.host;
    const everywhere = given === "0.0.0.0" || given === "::";
    const host = everywhere ? "127.0.0.1" : given.includes(":") ? `[${given}]` : given;
    return `http://${host}:${this.#port}/`;
  }

  /** Counts are read by these conversions from now on, also by a desk started later. */
  adopt(conversions: DeskConfig["conversions"]): void {
    this.#config = { ...this.#config, conversions };
    if (this.#child?.connected === true) this.#child.send({ kind: "conversions", conversions });
  }

  close(): void {
    this.#ended = true;
    clearInterval(this.#watch);
    this.#child?.kill("SIGKILL");
  }

  #start(): void {
    // The port taken first is kept over restarts, so that open pages find the desk again.
    const config = { ...this.#config, port: this.#port };
    const child = fork(
      fileURLToPath(builtFile("daemon/desk/process.js")),
      [JSON.stringify(config)],
      {
        stdio: ["ignore", "ignore", "inherit", "ipc"],
        execArgv: ["--single-threaded-gc"],
        // Ctrl-C at the terminal is for the daemon, which then ends its desk.
        detached: true,
      },
    );
    this.#child = child;
    this.#heard_ms = 0;
    if (child.pid !== undefined) this.#lower(child.pid);
    child.on("message", (message) => this.#heard(message as FromDesk));
    child.on("error", (error) => this.#tell(`The desk did not start: ${error.message}.`));
    child.on("exit", () => this.#gone());
  }

  #gone(): void {
    if (this.#ended) return;
    this.#child = null;
    this.#tell("The desk ended and is started again; judge and record go on.");
    this.#settle("it ended before it listened");
    setTimeout(() => this.#ended || this.#start(), this.#again_ms);
    this.#again_ms = Math.min(AGAIN_ms_MAX, this.#again_ms * 2);
  }

  #tell(words: string): void {
    if (this.#told === words) return;
    this.#told = words;
    this.#onWords(words);
  }

  #settle(failed: string): void {
    for (const ready of this.#ready.splice(0)) ready(failed);
  }

  #lower(pid: number): void {
    try {
      setPriority(pid, NICE);
    } catch (error) {
      this.#tell(`The desk's priority could not be lowered: ${reasonOf(error)}.`);
    }
  }

  #heard(message: FromDesk): void {
    this.#heard_ms = performance.now();
    if (message.kind === "listening") {
      this.#port = message.port;
      this.#again_ms = AGAIN_ms_MIN;
      this.#told = "";
      this.#settle("");
    } else if (message.kind === "failed") {
      this.#tell(`The desk did not start: ${message.words}`);
      this.#settle(message.words);
    }
  }

  #look(): void {
    if (this.#heard_ms === 0 || performance.now() - this.#heard_ms < SILENCE_ms_MAX) return;
    this.#tell("The desk hangs and is ended; judge and record go on.");
    this.#child?.kill("SIGKILL");
  }
}
