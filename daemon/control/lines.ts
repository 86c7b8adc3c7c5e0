/** Longest line either side of the switch accepts, bytes: a bench file travels in one (`adopt`). */
export const SWITCH_LINE_BYTES_MAX = 2 * 1024 * 1024;

/**
 * Cuts a byte stream into lines. A line over the limit ends the stream: `tooLong` is called once and
 * nothing more is handed over, so that a stray program on the socket cannot grow memory.
 */
export class LineCutter {
  #rest = "";
  #dead = false;
  readonly #onLine: (line: string) => void;
  readonly #tooLong: () => void;

  constructor(onLine: (line: string) => void, tooLong: () => void) {
    this.#onLine = onLine;
    this.#tooLong = tooLong;
  }

  push(text: string): void {
    if (this.#dead) return;
    this.#rest += text;
    let end = this.#rest.indexOf("\n");
    while (end >= 0) {
      const line = this.#rest.slice(0, end).trim();
      this.#rest = this.#rest.slice(end + 1);
      if (line !== "") this.#onLine(line);
      end = this.#rest.indexOf("\n");
    }
    if (this.#rest.length > SWITCH_LINE_BYTES_MAX) {
      this.#dead = true;
      this.#rest = "";
      this.#tooLong();
    }
  }
}
