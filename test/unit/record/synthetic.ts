import { mkdtempSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import type { BenchEvent } from "../../../daemon/model/event.ts";

import { Ring, ringBytes } from "../../../daemon/model/ring.ts";
import { mono, wall } from "../../../daemon/model/times.ts";
import { Recorder, type RecorderOptions } from "../../../daemon/record/recorder.ts";
import { MANIFEST, publish, type RowMaker, START_ms } from "./row-maker.ts";

/** A data folder of a test's own, and its removal. */
export function scratchFolder(): { folder: string; remove(): void } {
  const root = mkdtempSync(join(tmpdir(), "beamsitter-record-"));
  return {
    folder: join(root, "data"),
    remove: () => rmSync(root, { recursive: true, force: true }),
  };
}

export const event = (id: number, kind: BenchEvent["kind"], hazard = ""): BenchEvent => ({
  id,
  bench: "north",
  input: id,
  tick: 5,
  mono: mono(id),
  wall: wall(START_ms + id),
  kind,
  hazard,
  data: { a: 0.1, b: Number.NaN, words: "a word" },
});

/** A recorder in this thread, its ring, and what it told. */
export function recording(folder: string, rows = 2000, more: Partial<RecorderOptions> = {}) {
  const ring = new Ring(new SharedArrayBuffer(ringBytes(rows)));
  const told: unknown[] = [];
  const recorder = new Recorder({
    folder,
    bench: "north",
    benchText: "name: north\n",
    judgeVersion: 1,
    ring: ring.memory,
    durability: "none",
    tell: (message) => told.push(message),
    ...more,
  });
  return { ring, recorder, told };
}

/** Records rows 0 … count − 1 of a maker in one lit session, and returns them. */
export function recordRows(folder: string, maker: RowMaker, count: number): Float64Array[] {
  const { ring, recorder } = recording(folder);
  recorder.take({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
  recorder.take({ kind: "session", ringRow: 0, session: "lit", at: wall(START_ms) });
  const rows: Float64Array[] = [];
  for (let i = 0; i < count; i++) {
    const row = maker(i);
    rows.push(row);
    publish(ring, row);
    if (i % 997 === 0) recorder.drain();
  }
  recorder.close();
  return rows;
}
