import type { EventLine } from "../control/api.ts";
import { Running } from "./answers.ts";
import { jsonLine } from "./say.ts";
import { clock, eventText, Terminal } from "./terminal.ts";

/** What a running daemon shows at its terminal: where its page is, then a line for each event. */
export class Telling {
  readonly #terminal = new Terminal();
  readonly #json: boolean;
  /** Events before the start is told; null afterwards. */
  #early: EventLine[] | null = [];

  constructor(json: boolean) {
    this.#json = json;
  }

  started(start: Running & { kind: "started" }, hints: number): void {
    if (this.#json) this.#terminal.line(jsonLine(Running, start));
    else {
      const { bench, page, folder } = start;
      this.#terminal.line(`beamsitter watches ${bench}; its page: ${page}`);
      this.#terminal.line(
        `The record is kept in ${folder}. Ctrl-C ends it and leaves the bench dark.`,
      );
      if (hints > 0) {
        this.#terminal.line(`The bench file can be bettered, ${hints} hints: beamsitter check.`);
      }
    }
    const early = this.#early ?? [];
    this.#early = null;
    for (const event of early) this.event(event);
  }

  event(event: EventLine): void {
    if (this.#early !== null) this.#early.push(event);
    else if (this.#json) this.#terminal.line(jsonLine(Running, { kind: "event", event }));
    else this.#terminal.line(eventText(event));
  }

  /** Words for the person at the terminal that are no event of the bench. */
  note(words: string): void {
    if (!this.#json) this.#terminal.line(`${clock(Date.now())}        ${words}`);
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
