import { ReadlineParser } from "@serialport/parser-readline";
import { SerialPort } from "serialport";
import type { LevelOrder } from "../../model/stream.ts";
import { GuardStream, LINE_BYTES_PASSED, withoutReturn } from "./lines.ts";
import { Once } from "./once.ts";
import { openFailureWords } from "./serial-words.ts";
import { SilenceWatch, silenceWords } from "./silence-watch.ts";
import {
  SILENCE_ms,
  type Transport,
  type TransportHandlers,
  WAITING_BYTES_MAX,
} from "./transport.ts";

export interface SerialOptions {
  /** Device file, used as given: it need not be in any list of ports. */
  readonly path: string;
  readonly baud: number;
  /** Silence after which the port is given up, ms. */
  readonly silence_ms?: number;
  /** Longest line, bytes; that of the line protocol where left out. */
  readonly lineBytes_max?: number;
  /** Keeps modem lines asserted when the port closes: one of them may be holding light off. */
  readonly keepsLines?: boolean;
}

/**
 * One connection over a serial port. What the library does that must not happen is kept off here:
 * it queues writes for a closed port and sends them when it reopens, never calls back a drain of a
 * closed port, and can miss a hang-up without any event.
 */
export class SerialTransport implements Transport {
  readonly name: string;
  private readonly port: SerialPort;
  private readonly silence_ms: number;
  private readonly lineBytes_max: number;
  private readonly once = new Once();
  private readonly watch = new SilenceWatch();
  private waiting = 0;
  /** Whether bytes may still be in the driver, and whether we asked to be told when they are not. */
  private unsent = false;
  private draining = false;

  constructor({
    path,
    baud,
    silence_ms = SILENCE_ms,
    lineBytes_max = LINE_BYTES_PASSED,
    keepsLines = false,
  }: SerialOptions) {
    this.lineBytes_max = lineBytes_max;
    this.name = `${path} at ${baud} baud`;
    this.silence_ms = silence_ms;
    // The lock keeps other programs that ask for one off the port; a second host is refused by it.
    this.port = new SerialPort({
      path,
      baudRate: baud,
      autoOpen: false,
      lock: true,
      hupcl: !keepsLines,
    });
  }

  open(handlers: TransportHandlers): void {
    this.once.begin(handlers);
    const { port } = this;
    port.on("error", (error) => this.lost(`${this.name} failed: ${error.message}`));
    port.on("close", () => this.lost(`${this.name} was closed: unplugged, or its driver gave up`));
    port.on("end", () => this.lost(`${this.name} hung up`));
    port.open((error) => {
      if (error !== null) void this.failed(error.message);
      // Closed by its owner while it opened.
      else if (this.once.isEnded) this.release();
      else this.stands();
    });
  }

  write(line: string): boolean {
    if (!this.once.isOpen || !this.port.isOpen) return false;
    const bytes = Buffer.from(line, "latin1");
    if (this.waiting + bytes.length > WAITING_BYTES_MAX) return false;
    this.waiting += bytes.length;
    this.unsent = true;
    this.port.write(bytes, () => {
      this.waiting -= bytes.length;
      this.drain();
    });
    return true;
  }

  /** The other line stays asserted, as opening the port left it. */
  level({ line, asserted }: LevelOrder): void {
    if (!this.once.isOpen || !this.port.isOpen) return;
    const lines = line === "rts" ? { rts: asserted, dtr: true } : { rts: true, dtr: asserted };
    this.port.set(lines, (error) => {
      if (error !== null)
        this.lost(`${this.name} has no line ${line.toUpperCase()}: ${error.message}`);
    });
  }

  get drained(): boolean {
    return this.once.isOpen && !this.unsent;
  }

  close(): void {
    if (this.once.end()) this.release();
  }

  private stands(): void {
    const guard = new GuardStream(this.lineBytes_max);
    const parser = new ReadlineParser({ delimiter: "\n", encoding: "latin1" });
    this.port.on("data", () => this.watch.heard());
    parser.on("data", (text: string) => {
      const line = withoutReturn(text);
      if (line !== "") this.once.line(line);
    });
    this.port.pipe(guard).pipe(parser);
    this.watch.start(this.silence_ms, (ms) => this.lost(silenceWords(this.name, ms)));
    this.once.opened();
  }

  /** Asks the driver, one question at a time, whether all bytes have left. Nobody waits for it. */
  private drain(): void {
    if (this.draining || this.waiting > 0 || !this.port.isOpen) return;
    this.draining = true;
    this.port.drain(() => {
      this.draining = false;
      if (this.waiting === 0) this.unsent = false;
    });
  }

  private async failed(message: string): Promise<void> {
    this.once.closed(await openFailureWords(this.port.path, message));
  }

  private lost(why: string): void {
    if (this.once.isEnded) return;
    this.release();
    this.once.closed(why);
  }

  /** Gives the device back. A port that only hung up stays open, and spins, until this is done. */
  private release(): void {
    this.watch.stop();
    this.port.unpipe();
    if (this.port.isOpen) {
      this.port.close((error) => {
        // The device is gone already; there is nobody left to tell and nothing left to undo.
        if (error !== null) this.port.destroy();
      });
    }
  }
}
