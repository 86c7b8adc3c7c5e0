import type { EventLine, SwitchAnswer } from "../control/api.ts";
import type { Bench } from "../model/bench.ts";
import type { BenchEvent } from "../model/event.ts";
import type { Manifest } from "../model/manifest.ts";
import type { ToRecorder } from "../model/record-messages.ts";
import type { LevelOrder } from "../model/stream.ts";
import type { Mono_ms, Wall_ms } from "../model/times.ts";

/** The board's table: raw case counts ascending, and the current allowed there in set counts. */
export interface Curve {
  readonly x: readonly number[];
  readonly y: readonly number[];
}

/**
 * Everything the loop needs from outside. Live, the functions stand on sockets and clocks; in a
 * demo or a campaign on a simulated clock and a simulated wire. The loop itself does no I/O.
 */
export interface LoopPorts {
  now(): Mono_ms;
  wall(): Wall_ms;
  /** Puts one line (with its end) on the wire; false where it could not be sent. */
  write(line: string): boolean;
  /** Puts a modem line at a level, where the bench's cut-off is one. */
  level?(order: LevelOrder): void;
  /** Whether everything written before has left: a permit waits for that, dark does not. */
  drained(): boolean;
  record(message: ToRecorder): void;
  /** An event, in words for watchers and whole for whoever counts. */
  event(line: EventLine, event: BenchEvent): void;
  /** The board's table for this bench on this controller, or what stands in its way. */
  curve(bench: Bench, manifest: Manifest): Curve | { readonly problems: readonly string[] };
}

/** Answer to a request, before the switch puts its number on it. */
export type LoopAnswer = Omit<SwitchAnswer, "id">;
