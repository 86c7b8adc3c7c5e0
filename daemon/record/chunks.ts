import type Database from "better-sqlite3";
import type { Manifest } from "../model/manifest.ts";
import { Block, CODEC } from "./blocks.ts";

/** A stored run of samples: a packed block, or a chunk of the one still growing. */
export interface Chunk {
  /** Row id in `blocks`; negative for chunks of the tail, which have no rollup yet. */
  readonly id: number;
  readonly session: number;
  readonly run: number;
  readonly t0: number;
  readonly t1: number;
  readonly input0: number;
  readonly n: number;
  readonly manifest: number;
  readonly benchFile: number;
  /** 1 where only its rollups are left. */
  readonly retired: 0 | 1;
}

/** Which chunks are wanted; a bound left out does not bind. */
export interface ChunkFilter {
  readonly bench?: string;
  readonly session?: number;
  readonly run?: number;
  readonly from?: number;
  readonly to?: number;
  /** Only what the coarser rollups do not have yet: the tail, and blocks of an older program. */
  readonly unrolled?: true;
}

/** A block spans at most its minute; this much is allowed for civil time that ran differently. */
const SPAN_ms_MAX = 120_000;

const COLUMNS = `id, session, run, t0, t1, input0, n, manifest, bench_file AS benchFile,
  codec = ${CODEC.retired} AS retired`;

/**
 * The chunks that exist at this moment, found in one short read transaction. Blocks never change,
 * and the tail's bytes are taken along, so reading them later needs no transaction held open.
 */
export class ChunkIndex {
  readonly chunks: readonly Chunk[];
  readonly #tails: ReadonlyMap<number, Stored>;
  readonly #samples: Database.Statement;
  readonly #rollup: Database.Statement;

  constructor(db: Database.Database, filter: ChunkFilter) {
    this.#samples = db.prepare("SELECT codec, crc, blob FROM blocks WHERE id = ?");
    this.#rollup = db.prepare("SELECT codec, crc, blob FROM rollup_1s WHERE block = ?");
    const { unrolled, ...bounds } = filter;
    const { where, values } = conditions(bounds);
    const blocks = unrolled === true ? `${where || "WHERE true"} AND rolled = 0` : where;
    const read = db.transaction(() => ({
      blocks: db.prepare(`SELECT ${COLUMNS} FROM blocks ${blocks}`).all(values) as Chunk[],
      tails: db
        .prepare(`SELECT ${COLUMNS}, codec, crc, blob FROM tail ${where}`)
        .all(values) as (Chunk & Stored)[],
    }))();
    this.#tails = new Map(read.tails.map((row) => [-row.id, row]));
    this.chunks = [...read.blocks, ...read.tails.map((row) => ({ ...row, id: -row.id }))].sort(
      (a, b) => a.t0 - b.t0 || a.run - b.run || a.input0 - b.input0,
    );
  }

  /** Opens a chunk's samples; says which one is damaged and why, where it is. */
  open(chunk: Chunk): Block | { readonly fault: string } {
    const stored = this.#tails.get(chunk.id) ?? this.#samples.get(chunk.id);
    return openStored(stored as Stored | undefined, `block ${chunk.id}`);
  }

  /** Opens the one-second rollup that schema version 1 kept of a block; null where there is none. */
  openRollup(chunk: Chunk): Block | { readonly fault: string } | null {
    const stored = chunk.id < 0 ? undefined : this.#rollup.get(chunk.id);
    if (stored === undefined) return null;
    return openStored(stored as Stored, `the rollup of block ${chunk.id}`);
  }
}

export interface Stored {
  readonly codec: number;
  readonly crc: number;
  readonly blob: Uint8Array;
}

/** Opens stored bytes; a fault names the chunk by `name`. */
export function openStored(
  stored: Stored | undefined,
  name: string,
): Block | { readonly fault: string } {
  if (stored === undefined) return { fault: `${name} is missing` };
  const block = Block.open(stored.codec, stored.crc, stored.blob);
  return "fault" in block ? { fault: `${name} cannot be read: ${block.fault}` } : block;
}

/** The plus keeps SQLite from looking up all blocks of a run where a window names a few. */
function conditions(filter: Omit<ChunkFilter, "unrolled">): {
  where: string;
  values: Record<string, unknown>;
} {
  const parts: string[] = [];
  if (filter.session !== undefined) parts.push("session = @session");
  if (filter.run !== undefined) parts.push("run = @run");
  if (filter.bench !== undefined) parts.push("+run IN (SELECT id FROM runs WHERE bench = @bench)");
  if (filter.from !== undefined) parts.push("t0 >= @from - @span AND t1 >= @from");
  if (filter.to !== undefined) parts.push("t0 < @to");
  const where = parts.length === 0 ? "" : `WHERE ${parts.join(" AND ")}`;
  return { where, values: { ...filter, span: SPAN_ms_MAX } };
}

/** Manifests by row id, read once each. */
export class Manifests {
  readonly #db: Database.Database;
  readonly #known = new Map<number, Manifest>();

  constructor(db: Database.Database) {
    this.#db = db;
  }

  of(id: number): Manifest {
    const known = this.#known.get(id);
    if (known !== undefined) return known;
    const json = this.#db.prepare("SELECT json FROM manifests WHERE id = ?").pluck().get(id);
    const manifest = JSON.parse(String(json)) as Manifest;
    this.#known.set(id, manifest);
    return manifest;
  }
}
