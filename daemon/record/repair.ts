import type Database from "better-sqlite3";
import type { Manifest } from "../model/manifest.ts";
import { Block, packColumns } from "./blocks.ts";
import { Staging } from "./staging.ts";

interface TailRow {
  readonly id: number;
  readonly block: number;
  readonly session: number;
  readonly run: number;
  readonly n: number;
  readonly manifest: number;
  readonly bench_file: number;
  readonly codec: number;
  readonly crc: number;
  readonly blob: Uint8Array;
}

/**
 * Packs the chunks that a killed recorder left, so that the record looks as if it had been closed,
 * and ends the sessions that nobody ended. All of it or nothing; a chunk that cannot be read is
 * left out and named in the answer.
 */
export function repairTail(db: Database.Database): string[] {
  const faults: string[] = [];
  db.transaction(() => {
    const blocks = db.prepare("SELECT DISTINCT block FROM tail ORDER BY block").pluck().all();
    const chunks = db.prepare("SELECT * FROM tail WHERE block = ? ORDER BY id");
    for (const block of blocks) packGroup(db, chunks.all(block) as TailRow[], faults);
    db.exec("DELETE FROM tail");
    db.exec("UPDATE sessions SET ended_wall_ms = last_wall_ms WHERE ended_wall_ms IS NULL");
  }).immediate();
  return faults;
}

function packGroup(db: Database.Database, group: readonly TailRow[], faults: string[]): void {
  const first = group[0];
  if (first === undefined) return;
  const json = db.prepare("SELECT json FROM manifests WHERE id = ?").pluck().get(first.manifest);
  const manifest = JSON.parse(String(json)) as Manifest;
  const staging = new Staging(manifest);
  for (const row of group) {
    const block = Block.open(row.codec, row.crc, row.blob);
    if ("fault" in block) faults.push(`chunk ${row.id} of block ${row.block}: ${block.fault}`);
    else staging.append(block.n, (id) => block.column(id));
  }
  if (staging.n === 0) return;
  const { t0, t1, input0, input1 } = staging.bounds(0, staging.n);
  const coded = packColumns(staging.columns, 0, staging.n);
  db.prepare(
    `INSERT INTO blocks (id, session, run, t0, t1, input0, input1, n, manifest, bench_file,
     codec, crc, blob) VALUES (?,?,?,?,?,?,?,?,?,?,?,?,?)`,
  ).run(
    ...[first.block, first.session, first.run, t0, t1, input0, input1, staging.n],
    ...[first.manifest, first.bench_file, coded.codec, coded.crc, coded.blob],
  );
}
