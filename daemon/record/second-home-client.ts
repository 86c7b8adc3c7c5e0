import { Worker } from "node:worker_threads";
import type { InfluxPart } from "../model/bench.ts";
import { builtFile } from "../paths.ts";
import type { SecondHomeState, ToSecondHome } from "./second-home-run.ts";

/** Longest wait for what is left to be sent when the daemon ends; the next one sends the rest. */
const CLOSE_ms_MAX = 1500;

/** The daemon's end of the second home. Nothing here waits for a server or a disk. */
export class SecondHomeClient {
  readonly #worker: Worker;
  readonly #gone: Promise<void>;

  /** @param tell hears the state when its words change */
  constructor(folder: string, influx: InfluxPart, tell: (state: SecondHomeState) => void) {
    this.#worker = new Worker(builtFile("daemon/record/second-home-worker.js"));
    let told = "";
    const say = (state: SecondHomeState): void => {
      if (state.words === told) return;
      told = state.words;
      tell(state);
    };
    this.#gone = new Promise((resolve) => this.#worker.once("exit", () => resolve()));
    this.#worker.on("message", say);
    this.#worker.on("error", (error) => {
      const words = `Writing to ${influx.url} ended by itself (${error.message}); the record goes on, and the next start sends the rest.`;
      say({ kind: "state", words, waiting: 0, sent: 0, lost: 0, dropped: 0 });
    });
    this.#post({ kind: "open", folder, influx });
  }

  /** Sends what is left, for a short while, and ends the thread. */
  async close(): Promise<void> {
    this.#post({ kind: "close", within_ms: CLOSE_ms_MAX });
    let timer: NodeJS.Timeout | undefined;
    const late = new Promise<void>((resolve) => {
      timer = setTimeout(resolve, CLOSE_ms_MAX + 500);
    });
    await Promise.race([this.#gone, late]);
    clearTimeout(timer);
    await this.#worker.terminate();
  }

  #post(message: ToSecondHome): void {
    this.#worker.postMessage(message);
  }
}
