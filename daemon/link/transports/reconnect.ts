import type { LevelOrder } from "../../model/stream.ts";
import type { Transport, TransportHandlers } from "./transport.ts";

/** First pause before another connection is tried; doubled each time, up to the longest. */
export const PAUSE_ms_MIN = 250;
export const PAUSE_ms_MAX = 10_000;
/** Tries without one received line before it ends: about a day of the longest pause. */
export const TRIES_MAX = 8640;

/** Where reconnecting stands, for people. */
export interface ReconnectStatus {
  readonly state: "connecting" | "open" | "pausing" | "ended";
  /** What it connects to. */
  readonly name: string;
  /** Tries since the last line that came. */
  readonly tries: number;
  readonly pause_ms: number;
  /** Why the last connection ended or did not come; empty before any. */
  readonly why: string;
}

/** Runs a function later; gives back how to call it off. */
export type Later = (ms: number, run: () => void) => () => void;

const later: Later = (ms, run) => {
  const timer = setTimeout(run, ms);
  return () => clearTimeout(timer);
};

/**
 * Keeps a connection up: a new transport for each try, longer pauses while nothing comes, an end
 * that is shown. It never carries a line from one connection to the next.
 */
export class Reconnect {
  private readonly make: () => Transport;
  private readonly handlers: TransportHandlers;
  private readonly later: Later;
  private transport: Transport | null = null;
  private state: ReconnectStatus["state"] = "connecting";
  private tries = 0;
  private pause_ms = 0;
  private why = "";
  private name = "";
  private callOff: () => void;

  /** The first connection is tried right after the call that made this. */
  constructor(make: () => Transport, handlers: TransportHandlers, wait: Later = later) {
    this.make = make;
    this.handlers = handlers;
    this.later = wait;
    this.callOff = wait(0, () => this.connect());
  }

  /** Sends one line (with its end) if a connection stands; else it is dropped, never kept. */
  write(line: string): boolean {
    return this.state === "open" && this.transport !== null && this.transport.write(line);
  }

  /** Puts a modem line at a level, if a connection stands that has one. */
  level(order: LevelOrder): void {
    if (this.state === "open") this.transport?.level?.(order);
  }

  /** Whether a connection stands and everything written to it has left. */
  get drained(): boolean {
    return this.state === "open" && this.transport?.drained === true;
  }

  get status(): ReconnectStatus {
    const { state, name, tries, pause_ms, why } = this;
    return { state, name, tries, pause_ms, why };
  }

  /** Where it stands, in a sentence. */
  words(): string {
    const { name, why, tries } = this;
    switch (this.state) {
      case "open":
        return `Connected to ${name}.`;
      case "connecting":
        return name === "" ? "Connecting." : `Connecting to ${name}.`;
      case "pausing":
        return `${why} Try ${tries + 1} follows in ${(this.pause_ms / 1000).toFixed(1)} s.`;
      case "ended":
        return `${why} Given up after ${tries} tries; start the daemon again.`;
      default:
        return this.state satisfies never;
    }
  }

  /**
   * What stands in the way, in sentences; empty while lines come, and before the first try has
   * failed. The reason stays while the next try is under way.
   */
  trouble(): string {
    if (this.state === "pausing" || this.state === "ended") return this.words();
    if (this.why === "" || this.tries === 0) return "";
    return `${this.why} Try ${this.tries} is under way.`;
  }

  /** Ends the connection, for good and without a word to the handlers. */
  close(): void {
    this.callOff();
    this.state = "ended";
    this.transport?.close();
    this.transport = null;
  }

  private connect(): void {
    this.state = "connecting";
    this.tries += 1;
    const transport = this.make();
    this.transport = transport;
    this.name = transport.name;
    transport.open({
      opened: () => {
        if (this.transport !== transport) return;
        this.state = "open";
        this.handlers.opened();
      },
      line: (line) => {
        if (this.transport !== transport) return;
        // Only a line shows that somebody is there; an open port alone proves nothing.
        this.tries = 0;
        this.pause_ms = 0;
        this.handlers.line(line);
      },
      closed: (why) => {
        if (this.transport === transport) this.closed(why);
      },
    });
  }

  private closed(why: string): void {
    const wasOpen = this.state === "open";
    this.transport = null;
    this.why = /[.!?]$/.test(why) ? why : `${why}.`;
    if (this.tries >= TRIES_MAX) this.state = "ended";
    else {
      this.state = "pausing";
      this.pause_ms = Math.min(PAUSE_ms_MAX, Math.max(PAUSE_ms_MIN, this.pause_ms * 2));
      this.callOff = this.later(this.pause_ms, () => this.connect());
    }
    if (wasOpen) this.handlers.closed(why);
  }
}
