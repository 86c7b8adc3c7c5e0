import { LineSplitter } from "./lines.ts";
import { Once } from "./once.ts";
import type { BuiltInBench, Transport, TransportHandlers } from "./transport.ts";

/** A connection to a simulated bench in this process: the same bytes, without a wire. */
export class BuiltInTransport implements Transport {
  readonly name: string;
  private readonly bench: BuiltInBench;
  private readonly once = new Once();

  constructor(bench: BuiltInBench, name = "the built-in bench") {
    this.bench = bench;
    this.name = name;
  }

  open(handlers: TransportHandlers): void {
    this.once.begin(handlers);
    const lines = new LineSplitter((line) => this.once.line(line));
    queueMicrotask(() => {
      if (this.once.isEnded) return;
      // Started first, so that the host's first question already finds it.
      this.bench.start();
      this.bench.onBytes = (bytes) => lines.feed(bytes);
      this.once.opened();
    });
  }

  write(line: string): boolean {
    if (!this.once.isOpen) return false;
    this.bench.write(Buffer.from(line, "latin1"));
    return true;
  }

  get drained(): boolean {
    return this.once.isOpen;
  }

  close(): void {
    if (!this.once.end()) return;
    this.bench.onBytes = () => {};
    this.bench.stop();
  }
}
