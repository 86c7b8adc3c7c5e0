import { connect, type Socket } from "node:net";
import { LineSplitter } from "./lines.ts";
import { Once } from "./once.ts";
import { SilenceWatch, silenceWords } from "./silence-watch.ts";
import {
  SILENCE_ms,
  type Transport,
  type TransportHandlers,
  WAITING_BYTES_MAX,
} from "./transport.ts";

export interface TcpOptions {
  readonly host: string;
  readonly port: number;
  /** Silence after which the connection is given up, ms; also the longest wait for it to stand. */
  readonly silence_ms?: number;
  /** Longest line, bytes; that of the line protocol where left out. */
  readonly lineBytes_max?: number;
}

const failureWords = (name: string, error: NodeJS.ErrnoException): string => {
  switch (error.code) {
    case "ECONNREFUSED":
      return `${name} refuses: nothing listens there. Check the board's address, port and power.`;
    case "ENOTFOUND":
    case "EAI_AGAIN":
      return `${name}: no machine of that name is known. Write its address instead.`;
    case "EHOSTUNREACH":
    case "ENETUNREACH":
      return `${name} cannot be reached from this network.`;
    case "ECONNRESET":
    case "EPIPE":
      return `${name} broke the connection off.`;
    default:
      return `${name} failed: ${error.message}`;
  }
};

/** One connection over TCP: the same bytes as on a serial wire. */
export class TcpTransport implements Transport {
  readonly name: string;
  private readonly options: TcpOptions;
  private readonly silence_ms: number;
  private socket: Socket | null = null;
  private readonly once = new Once();
  private readonly watch = new SilenceWatch();

  constructor(options: TcpOptions) {
    this.name = `${options.host}, port ${options.port}`;
    this.options = options;
    this.silence_ms = options.silence_ms ?? SILENCE_ms;
  }

  open(handlers: TransportHandlers): void {
    this.once.begin(handlers);
    const { host, port } = this.options;
    const socket = connect({ host, port, noDelay: true });
    this.socket = socket;
    const lines = new LineSplitter((line) => this.once.line(line), this.options.lineBytes_max);
    // The wait for the connection is bounded by the same watch.
    this.watch.start(this.silence_ms, (ms) => this.lost(silenceWords(this.name, ms)));
    socket.on("connect", () => {
      this.watch.heard();
      this.once.opened();
    });
    socket.on("data", (chunk) => {
      this.watch.heard();
      lines.feed(chunk);
    });
    socket.on("error", (error) => this.lost(failureWords(this.name, error)));
    socket.on("end", () => this.lost(`${this.name} hung up.`));
    socket.on("close", () => this.lost(`${this.name} closed.`));
  }

  write(line: string): boolean {
    const { socket } = this;
    if (!this.once.isOpen || socket === null || socket.readyState !== "open") return false;
    if (socket.writableLength + line.length > WAITING_BYTES_MAX) return false;
    socket.write(line, "latin1");
    return true;
  }

  get drained(): boolean {
    return this.once.isOpen && this.socket?.writableLength === 0;
  }

  close(): void {
    if (this.once.end()) this.release();
  }

  private lost(why: string): void {
    if (this.once.isEnded) return;
    this.release();
    this.once.closed(why);
  }

  private release(): void {
    this.watch.stop();
    this.socket?.destroy();
  }
}
