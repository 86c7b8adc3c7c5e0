import { Worker } from "node:worker_threads";
import type { FromRecorder, StoredLatch, ToRecorder } from "../model/record-messages.ts";
import { workerFile } from "../paths.ts";
import { RecordProblem } from "./problem.ts";

/** What the judging thread starts from: where event numbers go on, and the latch on disk. */
export interface Opened {
  readonly lastEventId: number;
  readonly latch: StoredLatch | null;
}

export type RecorderStart = Omit<ToRecorder & { kind: "open" }, "kind">;

/**
 * The judging thread's end of the recorder. Nothing here waits for the disk: `post` hands a message
 * over, samples go through the ring, and what the recorder has to say comes to `tell`.
 */
export class RecorderClient {
  /** Settles once: rejects with a RecordProblem that says what to do about the data folder. */
  readonly opened: Promise<Opened>;
  readonly #worker: Worker;
  readonly #tell: (message: FromRecorder) => void;
  readonly #flushes = new Map<number, () => void>();
  #flushId = 0;
  #state: "opening" | "open" | "closed" = "opening";
  readonly #gone: Promise<void>;

  constructor(start: RecorderStart, tell: (message: FromRecorder) => void) {
    this.#tell = tell;
    this.#worker = new Worker(workerFile("record"));
    this.#gone = new Promise((resolve) => this.#worker.once("exit", () => resolve()));
    this.opened = new Promise((resolve, reject) => {
      this.#worker.on("message", (message: FromRecorder) => {
        if (message.kind === "opened") {
          this.#state = "open";
          resolve(message);
        } else if (message.kind === "failed") {
          this.#state = "closed";
          reject(new RecordProblem(message.what, message.found, message.do));
        }
        this.#hear(message);
      });
      this.#worker.on("error", (error) => this.#lost(String(error.stack ?? error), reject));
      this.#worker.on("exit", (code) => this.#lost(`It ended with code ${code}.`, reject));
    });
    // Whoever starts a recorder may look at `opened` later; a refusal is also told as "failed".
    this.opened.catch(() => undefined);
    this.#worker.postMessage({ kind: "open", ...start } satisfies ToRecorder);
  }

  /** Hands a message over; returns at once. After the recorder ended nothing is done. */
  post(message: ToRecorder): void {
    if (this.#state !== "closed") this.#worker.postMessage(message);
  }

  /** Settles when everything posted and written to the ring before is on the disk, or was refused. */
  flush(): Promise<void> {
    if (this.#state === "closed") return Promise.resolve();
    const id = ++this.#flushId;
    return new Promise((resolve) => {
      this.#flushes.set(id, resolve);
      this.post({ kind: "flush", id });
    });
  }

  /** Ends the session and the recorder; settles when the folder is free. */
  async close(): Promise<void> {
    this.post({ kind: "close" });
    await this.#gone;
  }

  #hear(message: FromRecorder): void {
    if (message.kind === "flushed") this.#settleFlush(message.id);
    if (message.kind === "closed") this.#state = "closed";
    this.#tell(message);
  }

  #settleFlush(id: number): void {
    this.#flushes.get(id)?.();
    this.#flushes.delete(id);
  }

  #lost(found: string, reject: (problem: RecordProblem) => void): void {
    for (const id of [...this.#flushes.keys()]) this.#settleFlush(id);
    if (this.#state === "closed") return;
    this.#state = "closed";
    const what = "The recorder ended by itself; nothing more is recorded.";
    const remedy = "Restart the daemon when the bench is dark; report this if it comes back.";
    reject(new RecordProblem(what, found, remedy));
    this.#tell({ kind: "failed", what, found, do: remedy });
  }
}
