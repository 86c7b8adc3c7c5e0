import type { EventLine } from "../control/api.ts";
import { Running } from "./answers.ts";
import { jsonLine } from "./say.ts";
import { clock, EVENT_INDENT, eventText, Terminal } from "./terminal.ts";

/** What a running daemon shows at its terminal: where its page is, then a line for each event. */
export class Telling {
  readonly #terminal = new Terminal();
  readonly #json: boolean;
  /** Events before the start is told; null afterwards. */
  #early: EventLine[] | null = [];

  constructor(json: boolean) {
    this.#json = json;
  }

  /**
   * Where the daemon is to be found, then the events that came before.
   * @param more sentences for the person at the terminal
   */
  started(start: Running & { kind: "started" }, more: readonly string[]): void {
    if (this.#json) this.#terminal.line(jsonLine(Running, start));
    else {
      const { bench, page, folder } = start;
      const kept = `The record is kept in ${folder}. Ctrl-C ends it and leaves the bench dark.`;
      for (const line of [`beamsitter watches ${bench}; its page: ${page}`, kept, ...more]) {
        this.#terminal.line(line);
      }
    }
    const early = this.#early ?? [];
    this.#early = null;
    for (const event of early) this.event(event);
  }

  event(event: EventLine): void {
    if (this.#early !== null) this.#early.push(event);
    else if (this.#json) this.#terminal.line(jsonLine(Running, { kind: "event", event }));
    else this.#terminal.line(eventText(event), EVENT_INDENT);
  }

  /** Words for the person at the terminal that are no event of the bench. */
  note(words: string): void {
    if (!this.#json) this.#terminal.line(`${clock(Date.now())}        ${words}`, EVENT_INDENT);
  }

  ended(words: string): void {
    if (this.#json) this.#terminal.line(jsonLine(Running, { kind: "ended", words }));
    else this.note(words);
  }

  get isShown(): boolean {
    return this.#terminal.isDone;
  }

  close(): void {
    this.#terminal.close();
  }
}
