import { setPriority } from "node:os";
import { join } from "node:path";
import type { MessagePort } from "node:worker_threads";
import type { InfluxPart } from "../model/bench.ts";
import { openForReading } from "./folder.ts";
import { CREDENTIALS_FILE } from "./influx-credentials.ts";
import { PlaceFile, placeFile } from "./influx-place.ts";
import { InfluxServer } from "./influx-server.ts";
import { errorText } from "./problem.ts";
import { SecondHome } from "./second-home.ts";

/** From the daemon to the second home's thread. */
export type ToSecondHome =
  | { readonly kind: "open"; readonly folder: string; readonly influx: InfluxPart }
  /** Send what is left, for at most this long, then end. */
  | { readonly kind: "close"; readonly within_ms: number };

/** From the second home's thread, whenever something changes and about once a look. */
export interface SecondHomeState {
  readonly kind: "state";
  /** What is wrong and what to do, in sentences; empty while all is well. */
  readonly words: string;
  /** Samples in the record that are not there yet. */
  readonly waiting: number;
  /** Samples sent so far, those lost before they could be sent, and points the server did not keep. */
  readonly sent: number;
  readonly lost: number;
  readonly dropped: number;
}

/** Pace of looking for something new while all is sent: two seconds of samples in one body. */
const LOOK_ms = 2000;
/** Pause after a fault, doubled each time up to the longest. */
const AGAIN_ms_MIN = 500;
const AGAIN_ms_MAX = 30_000;
/** Less favoured than the judging thread by this much; on Linux it is this thread's alone. */
const NICE = 10;

/** Runs a second home at the other end of `port` until it is closed. */
export function runSecondHome(port: MessagePort): void {
  let runner: Runner | null = null;
  port.on("message", (message: ToSecondHome) => {
    if (message.kind === "open") {
      setPriority(0, NICE);
      runner = new Runner(message.folder, message.influx, (state) => port.postMessage(state));
      void runner.run().finally(() => port.close());
    } else if (runner === null) port.close();
    else runner.close(message.within_ms);
  });
}

class Runner {
  readonly #home: SecondHome;
  readonly #tell: (state: SecondHomeState) => void;
  #closeBy_ms = Number.POSITIVE_INFINITY;
  #wake: () => void = () => undefined;

  constructor(folder: string, influx: InfluxPart, tell: (state: SecondHomeState) => void) {
    this.#tell = tell;
    this.#home = new SecondHome(
      (work) => {
        const db = openForReading(folder);
        try {
          return work(db);
        } finally {
          db.close();
        }
      },
      new InfluxServer(influx, join(folder, CREDENTIALS_FILE)),
      new PlaceFile(placeFile(folder)),
      `${influx.url} ${influx.database}`,
    );
  }

  close(within_ms: number): void {
    this.#closeBy_ms = performance.now() + within_ms;
    this.#wake();
  }

  async run(): Promise<void> {
    let again_ms = AGAIN_ms_MIN;
    for (;;) {
      let pause_ms = LOOK_ms;
      try {
        if (await this.#home.step()) pause_ms = 0;
        else if (this.#isClosing) return;
        again_ms = AGAIN_ms_MIN;
        this.#state(this.#home.words);
      } catch (error) {
        if (this.#isClosing) return;
        pause_ms = again_ms;
        again_ms = Math.min(AGAIN_ms_MAX, again_ms * 2);
        this.#state(`${errorText(error)} ${this.#home.words}`.trim());
      }
      if (performance.now() >= this.#closeBy_ms) return;
      if (pause_ms > 0) await this.#pause(pause_ms);
    }
  }

  get #isClosing(): boolean {
    return this.#closeBy_ms !== Number.POSITIVE_INFINITY;
  }

  #pause(ms: number): Promise<void> {
    if (this.#isClosing) return Promise.resolve();
    return new Promise((resolve) => {
      const timer = setTimeout(resolve, ms);
      this.#wake = () => {
        clearTimeout(timer);
        resolve();
      };
    });
  }

  #state(words: string): void {
    const { samples, lost, dropped } = this.#home.place;
    this.#tell({
      kind: "state",
      words,
      waiting: this.#waiting(),
      sent: samples - lost,
      lost,
      dropped,
    });
  }

  #waiting(): number {
    try {
      return this.#home.waiting;
    } catch {
      // The record cannot be read at this moment: the words of the failed step say so.
      return 0;
    }
  }
}
