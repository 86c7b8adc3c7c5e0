import type { SwitchAnswer, SwitchPush } from "../control/api.ts";
import type { Question } from "../control/client.ts";

/** The part of the switch's client that the desk uses; `SwitchClient` is one. */
export interface SwitchPort {
  ask(question: Question): Promise<SwitchAnswer>;
  watch(onPush: (push: SwitchPush) => void): Promise<void>;
  close(): void;
  onClose: () => void;
}

/** Pause between two attempts to reach the switch, ms. */
const AGAIN_ms = 1000;

const silent = (verb: string): SwitchAnswer => ({
  id: 0,
  ok: false,
  reason: "no-answer",
  words: `The judging part of the daemon does not answer, so "${verb}" was not carried out.`,
});

/**
 * The desk's one connection to the switch. It watches for all pages together and connects again for
 * as long as the desk lives; whether it is connected is told to every page, so nothing is hidden.
 */
export class SwitchLine {
  readonly #connect: () => Promise<SwitchPort>;
  readonly #onPush: (push: SwitchPush) => void;
  readonly #onLine: (connected: boolean) => void;
  #port: SwitchPort | undefined;
  #again: NodeJS.Timeout | undefined;
  #closed = false;

  constructor(
    connect: () => Promise<SwitchPort>,
    on: {
      readonly push: (push: SwitchPush) => void;
      readonly line: (connected: boolean) => void;
    },
  ) {
    this.#connect = connect;
    this.#onPush = on.push;
    this.#onLine = on.line;
  }

  get connected(): boolean {
    return this.#port !== undefined;
  }

  /** Connects and watches. Resolves after the first attempt, whether or not it succeeded. */
  async open(): Promise<void> {
    try {
      const port = await this.#connect();
      port.onClose = () => this.#lost(port);
      this.#port = port;
      await port.watch((push) => this.#onPush(push));
      this.#onLine(true);
    } catch {
      // Not swallowed: the state "not connected" is what the pages are told, once a second.
      this.#port?.close();
      this.#lost(this.#port);
    }
  }

  /** Asks the switch; a silence comes back as a refusal in words, never as an exception. */
  async ask(question: Question): Promise<SwitchAnswer> {
    try {
      return (await this.#port?.ask(question)) ?? silent(question.verb);
    } catch {
      return silent(question.verb);
    }
  }

  close(): void {
    this.#closed = true;
    clearTimeout(this.#again);
    this.#port?.close();
  }

  #lost(port: SwitchPort | undefined): void {
    if (port !== this.#port || this.#closed) return;
    this.#port = undefined;
    this.#onLine(false);
    clearTimeout(this.#again);
    this.#again = setTimeout(() => void this.open(), AGAIN_ms);
  }
}
