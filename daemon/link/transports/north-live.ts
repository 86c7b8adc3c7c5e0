import { readFileSync } from "node:fs";
import { fileURLToPath } from "node:url";
import { parentPort, workerData } from "node:worker_threads";
import { North } from "../../bench-sim/north.ts";
import type { Bench } from "../../model/bench.ts";
import { assetFile } from "../../paths.ts";

/** What the built-in transport hands its worker. */
export interface NorthSetting {
  readonly bench: Bench;
  readonly seed: number;
  readonly rate_perS: number;
}

/** Length of one main-loop pass of the simulated board, and how often the worker catches up, ms. */
const PASS_ms = 1;
const CATCH_UP_ms = 2;
/** After a longer stall the board's clock goes on from where it was, as if it had been halted. */
const STALL_ms_MAX = 250;

/** Runs the built-in bench in real time, in a worker, speaking bytes with the judging thread. */
export function runNorth(): void {
  const port = parentPort;
  if (port === null) throw new Error("The built-in bench runs as a worker, not by itself.");
  const { bench, seed, rate_perS } = workerData as NorthSetting;
  const code = readFileSync(fileURLToPath(assetFile("firmware-protocol/wasm/controller.wasm")));
  const module = new WebAssembly.Module(code);
  const north = new North({ bench, module, seed, rate_perS, pass_ms: PASS_ms, tick: 1000 });
  north.onBytes = (bytes) => port.postMessage(bytes.slice());
  port.on("message", (bytes: Uint8Array) => north.write(bytes));
  let last = performance.now();
  let due_ms = 0;
  setInterval(() => {
    const now = performance.now();
    due_ms += Math.min(now - last, STALL_ms_MAX);
    last = now;
    north.advance(due_ms);
  }, CATCH_UP_ms);
}
