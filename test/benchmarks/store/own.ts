import { mkdtempSync, rmSync, statSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import Database from "better-sqlite3";
import { Ring, ringBytes } from "../../../daemon/model/ring.ts";
import { wall } from "../../../daemon/model/times.ts";
import { Block, packColumns } from "../../../daemon/record/blocks.ts";
import { CHANNEL_COLUMN } from "../../../daemon/record/columns.ts";
import { recordFile } from "../../../daemon/record/folder.ts";
import { openReader } from "../../../daemon/record/reader.ts";
import { Recorder } from "../../../daemon/record/recorder.ts";
import { median } from "../figure.ts";
import { BEGIN_ms, count, manifest, publish, type RowShape } from "./noise.ts";

/** What the program's own store does with rows of this shape. */
export const BENCH = "north";

export function scratch(): { folder: string; remove(): void } {
  const root = mkdtempSync(join(tmpdir(), "bs-store-"));
  return {
    folder: join(root, "data"),
    remove: () => rmSync(root, { recursive: true, force: true }),
  };
}

export interface Written {
  /** Channel values a second, of the recorder's own time. */
  readonly values_perS: number;
  /** Processor time over the time that the rows stand for. */
  readonly cpu_percent: number;
}

/** Records `rows` rows through the recorder, `atOnce` at a time, syncing as a daemon does. */
export function write(folder: string, shape: RowShape, rows: number, atOnce: number): Written {
  const ring = new Ring(new SharedArrayBuffer(ringBytes(2 * atOnce + 2)));
  let now_ms = 0;
  const recorder = new Recorder({
    folder,
    bench: BENCH,
    benchText: "bench: north\n",
    judgeVersion: 1,
    ring: ring.memory,
    now_ms: () => now_ms,
    wall_ms: () => BEGIN_ms + now_ms,
  });
  recorder.take({
    kind: "manifest",
    ringRow: 0,
    manifest: manifest(shape.channels, shape.rate_perS),
  });
  recorder.take({ kind: "session", ringRow: 0, session: "lit", at: wall(BEGIN_ms) });
  let busy_ms = 0;
  let cpu_us = 0;
  for (let row = 0; row < rows; ) {
    for (const end = Math.min(rows, row + atOnce); row < end; row++) publish(ring, row, shape);
    now_ms = (row * 1000) / shape.rate_perS;
    const began = performance.now();
    const cpu = process.cpuUsage();
    recorder.drain();
    const { user, system } = process.cpuUsage(cpu);
    cpu_us += user + system;
    busy_ms += performance.now() - began;
  }
  const began = performance.now();
  recorder.close();
  busy_ms += performance.now() - began;
  return {
    values_perS: (rows * shape.channels * 1000) / busy_ms,
    cpu_percent: (100 * cpu_us) / 1e6 / (rows / shape.rate_perS),
  };
}

export interface Sizes {
  /** Bytes a channel value: the blocks' own, rollups in blocks, and the whole file. */
  readonly blocks: number;
  readonly rollups: number;
  readonly file: number;
}

export function sizes(folder: string, values: number): Sizes {
  const db = new Database(recordFile(folder), { readonly: true });
  const total = (table: string): number =>
    Number(db.prepare(`SELECT sum(length(blob)) FROM ${table}`).pluck().get());
  const found = {
    blocks: total("blocks") / values,
    rollups: total("rollups") / values,
    file: statSync(recordFile(folder)).size / values,
  };
  db.close();
  return found;
}

export interface Asked {
  /** Milliseconds of the first question of a newly opened record, and of later ones. */
  readonly cold_ms: number;
  readonly warm_ms: number;
}

/** Times a question over `hours` up to the end, three channels, 2,000 pixels. */
export async function ask(folder: string, hours: number, end_ms: number): Promise<Asked> {
  const query = {
    bench: BENCH,
    channels: ["c1", "c2", "c3"],
    window: { from: wall(end_ms - hours * 3_600_000), to: wall(end_ms) },
    pixels: 2000,
  };
  const cold: number[] = [];
  const warm: number[] = [];
  for (let round = 0; round < 7; round++) {
    const began = performance.now();
    const reader = openReader(folder);
    await reader.series(query);
    cold.push(performance.now() - began);
    for (let i = 0; i < 5; i++) {
      const again = performance.now();
      await reader.series(query);
      warm.push(performance.now() - again);
    }
    reader.close();
  }
  // The first rounds are the compiler's.
  return { cold_ms: median(cold.slice(2)), warm_ms: median(warm.slice(10)) };
}

/** Channel values a second through the codec alone: encoding, decoding. */
export function codecSpeed(shape: RowShape): { encode_perS: number; decode_perS: number } {
  const n = 6000;
  const columns = Array.from({ length: shape.channels }, (_, c) => ({
    id: CHANNEL_COLUMN + c,
    values: Float64Array.from({ length: n }, (__, i) => count(i, c, shape.rate_perS, shape.sigma)),
  }));
  const coded = packColumns(columns, 0, n);
  const decode = (): void => {
    const block = Block.open(coded.codec, coded.crc, coded.blob);
    if ("fault" in block) throw new Error(block.fault);
    for (const { id } of columns) block.column(id);
  };
  const values = n * shape.channels;
  return {
    encode_perS: values / best_s(() => packColumns(columns, 0, n)),
    decode_perS: values / best_s(decode),
  };
}

/** The middle of many timings, after some for the compiler. */
function best_s(work: () => void): number {
  const times: number[] = [];
  for (let i = 0; i < 300; i++) {
    const began = performance.now();
    work();
    if (i >= 100) times.push(performance.now() - began);
  }
  return median(times) / 1000;
}
