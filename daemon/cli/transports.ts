import { Worker } from "node:worker_threads";
import { BuiltInTransport } from "../link/transports/built-in.ts";
import type { NorthSetting } from "../link/transports/north-live.ts";
import { SerialTransport } from "../link/transports/serial.ts";
import { TcpTransport } from "../link/transports/tcp.ts";
import { type BuiltInBench, SILENCE_ms, type Transport } from "../link/transports/transport.ts";
import type { Bench } from "../model/bench.ts";
import { STREAM_LINE_BYTES_MAX } from "../model/stream.ts";
import { builtFile } from "../paths.ts";

/** Makes a fresh connection to the bench's controller at each call. */
export function transportFor(bench: Bench): () => Transport {
  const spec = bench.controller.transport;
  switch (spec.kind) {
    case "serial":
      return () => new SerialTransport({ path: spec.path, baud: spec.baud, ...streamed(bench) });
    case "tcp":
      return () => new TcpTransport({ host: spec.host, port: spec.port, ...streamed(bench) });
    case "built-in": {
      const north = new NorthWorker({
        bench,
        seed: spec.seed,
        rate_perS: bench.controller.rate_perS,
      });
      return () => new BuiltInTransport(north);
    }
    default:
      return spec satisfies never;
  }
}

/** A stream may come once a second, in longer lines, and its cut-off outlives the port. */
const PERIODS_SILENT = 6;

function streamed({ controller }: Bench) {
  const { stream, rate_perS } = controller;
  if (stream === undefined) return {};
  return {
    lineBytes_max: STREAM_LINE_BYTES_MAX,
    silence_ms: Math.max(SILENCE_ms, (PERIODS_SILENT * 1000) / rate_perS),
    keepsLines: stream.cutOff?.kind === "line",
  };
}

/** The built-in bench in its worker. The board runs on while nobody is connected, as a real one. */
class NorthWorker implements BuiltInBench {
  onBytes: (bytes: Uint8Array) => void = () => {};
  readonly #setting: NorthSetting;
  #worker: Worker | null = null;

  constructor(setting: NorthSetting) {
    this.#setting = setting;
  }

  start(): void {
    if (this.#worker !== null) return;
    this.#worker = new Worker(builtFile("daemon/link/transports/north-worker.js"), {
      workerData: this.#setting,
    });
    this.#worker.on("message", (bytes: Uint8Array) => this.onBytes(bytes));
    this.#worker.unref();
  }

  write(bytes: Uint8Array): void {
    this.#worker?.postMessage(bytes);
  }

  stop(): void {
    // The board is not switched off by pulling its cable; the worker ends with the process.
  }
}
