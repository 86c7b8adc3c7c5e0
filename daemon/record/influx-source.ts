import type Database from "better-sqlite3";
import { type Chunk, Manifests, openStored, type Stored } from "./chunks.ts";
import { type Place, RUN_START, type RunPlace } from "./influx-place.ts";
import { type Point, samplePoints } from "./influx-points.ts";
import { type Precision, Stamps } from "./influx-stamps.ts";
import { textPoints } from "./influx-texts.ts";

/** What is to be sent next, and where the place stands when it has been. */
export interface Batch {
  readonly points: readonly Point[];
  readonly place: Place;
  /** What was left out, a sentence each. */
  readonly words: readonly string[];
}

/** A run that is older than this many others gets no more samples. */
const OPEN_RUNS_MAX = 64;
/** Chunks looked at in one go: a packed block has thousands of samples, a chunk of the tail some. */
const BLOCKS_MAX = 4;
const TAILS_MAX = 500;

const COLUMNS = `id, session, run, t0, t1, input0, input1, n, manifest, bench_file AS benchFile,
  codec, crc, blob`;

type StoredChunk = Chunk & Stored & { readonly input1: number };

/** The next samples after a place; null where all of them are sent. Reads in short transactions. */
export function nextSamples(
  db: Database.Database,
  place: Place,
  precision: Precision,
  points_max: number,
): Batch | null {
  const runs = db
    .prepare("SELECT id, bench FROM runs WHERE id > ? ORDER BY id")
    .all(place.runsDone) as { id: number; bench: string }[];
  for (const run of runs) {
    const at = place.runs[run.id] ?? RUN_START;
    const chunks = chunksAfter(db, run.id, at.input);
    if (chunks.length === 0) continue;
    return batchOf(db, place, { ...run, at, chunks }, precision, points_max);
  }
  return null;
}

function chunksAfter(db: Database.Database, run: number, input: number): StoredChunk[] {
  return db.transaction(() => {
    const start = db
      .prepare("SELECT coalesce(max(input0), 0) FROM blocks WHERE run = ? AND input0 <= ?")
      .pluck()
      .get(run, input) as number;
    const blocks = db
      .prepare(
        `SELECT ${COLUMNS} FROM blocks WHERE run = ? AND input0 >= ? AND input1 > ?
         ORDER BY input0 LIMIT ${BLOCKS_MAX}`,
      )
      .all(run, start, input) as StoredChunk[];
    if (blocks.length > 0) return blocks;
    return db
      .prepare(
        `SELECT ${COLUMNS} FROM tail WHERE run = ? AND input1 > ? ORDER BY input0 LIMIT ${TAILS_MAX}`,
      )
      .all(run, input) as StoredChunk[];
  })();
}

interface RunChunks {
  readonly id: number;
  readonly bench: string;
  readonly at: RunPlace;
  readonly chunks: readonly StoredChunk[];
}

function batchOf(
  db: Database.Database,
  place: Place,
  run: RunChunks,
  precision: Precision,
  points_max: number,
): Batch {
  const manifests = new Manifests(db);
  const stamps = new Stamps(precision, run.at.stamps);
  const points: Point[] = [];
  const words: string[] = [];
  let { input } = run.at;
  let { texts, samples, lost, dropped } = place;
  for (const chunk of run.chunks) {
    const room = points_max - points.length;
    if (room <= 0) break;
    const block = openStored(chunk, `block ${chunk.id}`);
    if ("fault" in block) {
      // Some of a retired block may have been sent before; only what was not is lost.
      const missing = Math.min(chunk.n, chunk.input1 - Math.max(input, chunk.input0 - 1));
      words.push(`${missing} samples cannot be sent: ${block.fault}.`);
      lost += missing;
      samples += missing;
      input = chunk.input1;
      continue;
    }
    const manifest = manifests.of(chunk.manifest);
    const source = { bench: run.bench, session: chunk.session, manifest, block };
    const made = samplePoints(source, input, stamps, room);
    const key = `${chunk.session}/${manifest.id}/${chunk.benchFile}`;
    const first = made.points[0];
    if (key !== texts && first !== undefined) {
      const text = String(
        db.prepare("SELECT text FROM bench_files WHERE id = ?").pluck().get(chunk.benchFile),
      );
      points.push(...textPoints(source, text, first.timestamp));
      texts = key;
    }
    points.push(...made.points);
    samples += made.points.length;
    dropped += made.broken;
    input = made.isWhole ? chunk.input1 : made.input;
  }
  const runs = trimmed({ ...place.runs, [run.id]: { input, stamps: stamps.state } });
  return {
    points,
    words,
    place: {
      ...place,
      ...runs,
      runsDone: Math.max(runs.runsDone, place.runsDone),
      texts,
      samples,
      lost,
      dropped,
    },
  };
}

/** Only the newest runs are looked at again. */
function trimmed(runs: Place["runs"]): Pick<Place, "runs" | "runsDone"> {
  const ids = Object.keys(runs)
    .map(Number)
    .sort((a, b) => b - a);
  const oldest = ids[OPEN_RUNS_MAX];
  if (oldest === undefined) return { runs, runsDone: 0 };
  const kept = ids.slice(0, OPEN_RUNS_MAX).map((id) => [id, runs[id] as RunPlace]);
  return { runs: Object.fromEntries(kept), runsDone: oldest };
}

/** Samples of the whole record, for "how many wait". */
export const samplesOf = (db: Database.Database): number =>
  db.prepare("SELECT coalesce(sum(samples), 0) FROM sessions").pluck().get() as number;
