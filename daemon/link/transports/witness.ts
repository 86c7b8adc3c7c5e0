import type { WitnessSpec } from "../../model/witness.ts";
import { SerialTransport } from "./serial.ts";
import { TcpTransport } from "./tcp.ts";
import type { Transport } from "./transport.ts";

/** What a witness tells. None may throw. */
export interface WitnessHandlers {
  /** One reading, in the unit of the spec. `identity` is what the instrument calls itself. */
  reading(value: number, identity: string): void;
  /** How it stands, in a sentence; told only where that changes. Empty while it answers. */
  state(words: string): void;
}

/** Longest wait for an answer: a meter that averages for a second answers after that. */
const ANSWER_ms = 5000;
/** Pauses before a lost connection is tried again: doubled each time, up to the longest. */
const AGAIN_ms = 1000;
const AGAIN_ms_MAX = 30_000;
/** Longest answer of an instrument. */
const ANSWER_BYTES_MAX = 1024;
/** Numbers as IEEE 488.2 answers them; 9.9E37 and above stand for overload and "not a number". */
const NUMBER = /^\s*([+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d{1,3})?)\s*(?:,|$)/;
const OVERLOAD = 9.9e37;

/**
 * Asks one instrument again and again: first who it is (`*IDN?`), then the spec's query once a
 * period, never a second question before the first was answered. Loses and finds it by itself.
 */
export class Witness {
  readonly #spec: WitnessSpec;
  readonly #handlers: WitnessHandlers;
  #transport: Transport | null = null;
  #timer: NodeJS.Timeout | undefined;
  #asked: "nothing" | "identity" | "reading" = "nothing";
  #identity = "";
  #again_ms = AGAIN_ms;
  /** Null until something was told. */
  #told: string | null = null;

  constructor(spec: WitnessSpec, handlers: WitnessHandlers) {
    this.#spec = spec;
    this.#handlers = handlers;
  }

  start(): void {
    const transport = this.#connection();
    this.#transport = transport;
    transport.open({
      opened: () => this.#ask("identity", "*IDN?"),
      line: (line) => this.#answered(line),
      closed: (why) => this.#lost(why),
    });
  }

  stop(): void {
    clearTimeout(this.#timer);
    this.#transport?.close();
    this.#transport = null;
  }

  #connection(): Transport {
    const { address, period_ms } = this.#spec;
    // An instrument speaks only when asked; its silence between is no loss.
    const silence_ms = period_ms + 2 * ANSWER_ms;
    const common = { silence_ms, lineBytes_max: ANSWER_BYTES_MAX };
    return address.kind === "tcp"
      ? new TcpTransport({ host: address.host, port: address.port, ...common })
      : new SerialTransport({ path: address.path, baud: address.baud, ...common });
  }

  #ask(what: "identity" | "reading", question: string): void {
    this.#asked = what;
    clearTimeout(this.#timer);
    this.#timer = setTimeout(() => this.#silent(question), ANSWER_ms);
    if (this.#transport?.write(`${question}\n`) !== true) this.#silent(question);
  }

  #answered(line: string): void {
    const asked = this.#asked;
    // A line that nobody asked for: a greeting, or an answer that came too late.
    if (asked === "nothing") return;
    this.#asked = "nothing";
    clearTimeout(this.#timer);
    this.#timer = setTimeout(
      () => this.#ask("reading", this.#spec.query),
      asked === "identity" ? 0 : this.#spec.period_ms,
    );
    if (asked === "identity") {
      this.#identity = line.trim();
      return;
    }
    this.#read(line);
  }

  #read(line: string): void {
    const { query, perRead } = this.#spec;
    const value = Number.parseFloat(NUMBER.exec(line)?.[1] ?? "");
    if (Number.isNaN(value)) {
      this.#tell(`${query} is answered with "${line.slice(0, 40)}", which is no number.`);
      return;
    }
    if (Math.abs(value) >= OVERLOAD) {
      this.#tell(`${query} is answered with an overload: its range is too small.`);
      return;
    }
    this.#again_ms = AGAIN_ms;
    this.#tell("");
    this.#handlers.reading(value * perRead, this.#identity);
  }

  #silent(question: string): void {
    this.#transport?.close();
    this.#lost(`${question} was not answered within ${ANSWER_ms / 1000} s.`);
  }

  #lost(why: string): void {
    this.#asked = "nothing";
    this.#transport = null;
    this.#tell(why);
    clearTimeout(this.#timer);
    this.#timer = setTimeout(() => this.start(), this.#again_ms);
    this.#again_ms = Math.min(2 * this.#again_ms, AGAIN_ms_MAX);
  }

  #tell(words: string): void {
    if (words === this.#told) return;
    this.#told = words;
    this.#handlers.state(words);
  }
}
