import type Database from "better-sqlite3";
import { ROW } from "../model/ring.ts";
import { type Chunk, ChunkIndex, Manifests } from "./chunks.ts";
import { checkPack, packFacts } from "./pack.ts";
import { errorCode, errorText } from "./problem.ts";
import { gapAfter_ms } from "./recorder.ts";
import { placeOfSession } from "./session-rows.ts";
import type { Work } from "./work.ts";

/** What a check of a record came to. Every fault is one sentence that names its place. */
export interface Verified {
  readonly sessions: number;
  readonly blocks: number;
  readonly samples: number;
  readonly gaps: number;
  readonly faults: readonly string[];
}

/** Chunks read between two steps. */
const CHUNKS_A_STEP = 16;

/**
 * Reads every block of a record (or of one session): its checksum, its rows against what stands
 * beside it, its rollup, the samples that each session counts, and whether each stretch without
 * samples is kept as a gap. A broken block is named, and the rest is checked all the same.
 */
export function* verify(db: Database.Database, session?: number): Work<Verified> {
  const faults: string[] = [];
  const index = new ChunkIndex(db, session === undefined ? {} : { session });
  const manifests = new Manifests(db);
  const counted = new Map<number, number>();
  const gaps = new GapCheck(db, faults);
  const { chunks } = index;
  for (const [i, chunk] of chunks.entries()) {
    counted.set(chunk.session, (counted.get(chunk.session) ?? 0) + chunk.n);
    const fault = guarded(chunk, () => checkChunk(index, chunk));
    if (fault !== "") faults.push(fault);
    gaps.next(chunk, manifests.of(chunk.manifest).rate_perS);
    if (i % CHUNKS_A_STEP === 0) yield { done: i, total: chunks.length };
  }
  const sessions = checkCounts(db, counted, faults, session);
  yield* checkHashes(db, faults);
  checkPages(db, faults);
  return {
    sessions,
    blocks: chunks.length,
    samples: [...counted.values()].reduce((sum, n) => sum + n, 0),
    gaps: gaps.found,
    faults,
  };
}

/** A page of the file that is damaged makes SQLite throw: that block's fault, and no other's. */
function guarded(chunk: Chunk, check: () => string): string {
  try {
    return check();
  } catch (error) {
    return `block ${chunk.id} cannot be read: ${errorCode(error) || errorText(error)}`;
  }
}

/** What is wrong with a chunk; empty where nothing is. */
function checkChunk(index: ChunkIndex, chunk: Chunk): string {
  if (chunk.retired === 1) return "";
  const name = chunk.id < 0 ? `chunk ${-chunk.id} of the growing block` : `block ${chunk.id}`;
  const block = index.open(chunk);
  if ("fault" in block) return `${block.fault} (session ${chunk.session})`;
  if (block.n !== chunk.n)
    return `${name} has ${block.n} samples, ${chunk.n} are written beside it`;
  const walls = block.column(ROW.wall_ms);
  const inputs = block.column(ROW.input);
  if (walls === null || inputs === null) return `${name} has no times`;
  if (walls.reduce((least, t) => Math.min(least, t), Number.POSITIVE_INFINITY) !== chunk.t0) {
    return `${name} does not begin when it says`;
  }
  if (inputs[0] !== chunk.input0) return `${name} does not begin with the input that it says`;
  const rollup = index.openRollup(chunk);
  return rollup !== null && "fault" in rollup ? rollup.fault : "";
}

function checkCounts(
  db: Database.Database,
  counted: ReadonlyMap<number, number>,
  faults: string[],
  session: number | undefined,
): number {
  const rows = db
    .prepare("SELECT id, samples FROM sessions WHERE @session IS NULL OR id = @session")
    .all({ session: session ?? null }) as { id: number; samples: number }[];
  for (const { id, samples } of rows) {
    const found = counted.get(id) ?? 0;
    if (found !== samples) {
      faults.push(`session ${id} counts ${samples} samples, its blocks hold ${found}`);
    }
  }
  return rows.length;
}

/** Whether what lies between two chunks of one run is kept as a gap where it is one. */
class GapCheck {
  found = 0;
  readonly #faults: string[];
  readonly #covers: Database.Statement;
  readonly #last = new Map<number, Chunk>();

  constructor(db: Database.Database, faults: string[]) {
    this.#faults = faults;
    this.#covers = db.prepare(
      "SELECT 1 FROM gaps WHERE from_wall_ms <= @from AND to_wall_ms >= @to LIMIT 1",
    );
  }

  next(chunk: Chunk, rate_perS: number): void {
    const before = this.#last.get(chunk.run);
    this.#last.set(chunk.run, chunk);
    if (before === undefined || chunk.t0 - before.t1 <= gapAfter_ms(rate_perS)) return;
    this.found++;
    // Half a millisecond: times are kept as they were, but a step of the clock may stand between.
    const bounds = { from: before.t1 + 0.5, to: chunk.t0 - 0.5 };
    if (this.#covers.get(bounds) !== undefined) return;
    this.#faults.push(
      `between block ${before.id} and block ${chunk.id} nothing was recorded, and no gap is kept`,
    );
  }
}

/** A pack carries hashes of all that is in it. */
function* checkHashes(db: Database.Database, faults: string[]): Work<void> {
  const facts = packFacts(db);
  const place = facts === null ? null : placeOfSession(db, facts.session);
  if (place === null) return;
  for (const fault of yield* checkPack(db, place)) faults.push(`the pack: ${fault}`);
}

/** The file's own structure, as SQLite sees it. */
function checkPages(db: Database.Database, faults: string[]): void {
  try {
    const answer = db.pragma("quick_check(20)") as { quick_check: string }[];
    for (const { quick_check } of answer) {
      if (quick_check !== "ok") faults.push(`the file: ${quick_check}`);
    }
  } catch (error) {
    faults.push(`the file: ${errorCode(error) || errorText(error)}`);
  }
}
