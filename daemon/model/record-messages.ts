import type { BenchEvent } from "./event.ts";
import type { Manifest } from "./manifest.ts";
import type { Wall_ms } from "./times.ts";

/** Kinds of session: from arming to dark, dark while connected, or watch only. */
export type SessionKind = "lit" | "dark" | "watched";

/** One input of the judge other than a sample, in order, so that a replay gives the same events. */
export interface JournalEntry {
  readonly input: number;
  readonly kind: number;
  readonly now_ms: number;
  readonly request: number;
  readonly asker: number;
  readonly requestId: number;
  readonly value: number;
  readonly fact: number;
  readonly factValue: number;
}

/** From the judging thread to the recorder. Samples travel in the ring, everything else here. */
export type ToRecorder =
  | {
      readonly kind: "open";
      readonly folder: string;
      readonly bench: string;
      readonly benchText: string;
      readonly judgeVersion: number;
      readonly ring: SharedArrayBuffer;
    }
  /** A bench file was adopted: rows of the ring from `ringRow` on were judged by this text. */
  | { readonly kind: "bench"; readonly ringRow: number; readonly benchText: string }
  /** A controller introduced itself; rows of the ring from `ringRow` on carry this manifest. */
  | { readonly kind: "manifest"; readonly ringRow: number; readonly manifest: Manifest }
  | {
      readonly kind: "session";
      readonly ringRow: number;
      readonly session: SessionKind | "end";
      readonly at: Wall_ms;
    }
  | { readonly kind: "event"; readonly event: BenchEvent }
  | { readonly kind: "journal"; readonly entry: JournalEntry }
  | { readonly kind: "flush"; readonly id: number }
  | { readonly kind: "close" };

/** From the recorder to the judging thread. */
export type FromRecorder =
  | { readonly kind: "opened"; readonly lastEventId: number; readonly latch: StoredLatch | null }
  | { readonly kind: "failed"; readonly what: string; readonly found: string; readonly do: string }
  | {
      readonly kind: "state";
      readonly readRows: number;
      readonly lostRows: number;
      /** Whether the last write failed: samples and events wait in memory, or are being lost. */
      readonly failing: boolean;
      /** What is wrong and what to do, in sentences; empty while all is well. */
      readonly words: string;
    }
  | { readonly kind: "flushed"; readonly id: number }
  | { readonly kind: "closed" };

/** The latch that outlives the daemon: written with the trip's event, cleared by reset. */
export interface StoredLatch {
  /** Cause code; −1 where the bench is not latched. */
  readonly cause: number;
  readonly wall: Wall_ms;
  readonly serial: string;
  /** Set from arming to an ordered dark: found at start, it means "stopped while armed". */
  readonly lit: boolean;
}
