import { INPUT, type Input } from "../judge/records.ts";
import { ROW } from "../model/ring.ts";
import { CHANNELS_MAX, newSample } from "../model/sample.ts";
import type { Block } from "./blocks.ts";
import { ChunkIndex } from "./chunks.ts";
import { CHANNEL_COLUMN, isFresh } from "./columns.ts";
import type { ReadParts } from "./reader.ts";

/** An input as the judge got it, and under which bench file and manifest (row ids of the record). */
export interface RecordedInput extends Input {
  benchFile: number;
  /** Null before any controller introduced itself. */
  manifest: number | null;
}

interface JournalRow {
  readonly input: number;
  readonly kind: number;
  readonly now_ms: number;
  readonly request: number;
  readonly asker: number;
  readonly request_id: number;
  readonly value: number;
  readonly fact: number;
  readonly fact_value: number;
  readonly bench_file: number;
  readonly manifest: number | null;
}

/** Journal entries read at once. */
const JOURNAL_ROWS = 2000;

/**
 * Samples and journal of a run, merged by the judge's own count. One record is filled again and
 * again. A damaged block is named in `faults` and left out: the count of inputs then has a hole.
 */
export function* inputsOf(parts: ReadParts, run: number): Generator<RecordedInput> {
  const journal = journalOf(parts, run);
  let entry = journal.next();
  const input = blankInput();
  const index = new ChunkIndex(parts.db, { run });
  const chunks = index.chunks.toSorted((a, b) => a.input0 - b.input0);
  for (const chunk of chunks) {
    const block = index.open(chunk);
    if ("fault" in block) {
      parts.faults.add(block.fault);
      continue;
    }
    const row = rowReader(block);
    for (let i = 0; i < block.n; i++) {
      const n = row.inputOf(i);
      for (; entry.done !== true && entry.value.input < n; entry = journal.next()) {
        yield fromJournal(input, entry.value);
      }
      row.fill(input, i);
      input.benchFile = chunk.benchFile;
      input.manifest = chunk.manifest;
      yield input;
    }
  }
  for (; entry.done !== true; entry = journal.next()) yield fromJournal(input, entry.value);
}

function* journalOf(parts: ReadParts, run: number): Generator<JournalRow> {
  const read = parts.db.prepare(
    "SELECT * FROM journal WHERE run = ? AND input > ? ORDER BY input LIMIT ?",
  );
  let after = -1;
  for (;;) {
    const rows = read.all(run, after, JOURNAL_ROWS) as JournalRow[];
    yield* rows;
    const last = rows[rows.length - 1];
    if (last === undefined) return;
    after = last.input;
  }
}

function blankInput(): RecordedInput {
  return {
    n: 0,
    kind: INPUT.sample,
    now_ms: 0,
    sample: newSample(),
    drift: 0,
    jump_ms: 0,
    newest: 0,
    portDrained: 0,
    request: 0,
    asker: 0,
    requestId: 0,
    value: 0,
    fact: 0,
    factValue: 0,
    benchFile: 0,
    manifest: null,
  };
}

function fromJournal(input: RecordedInput, row: JournalRow): RecordedInput {
  input.n = row.input;
  input.kind = row.kind;
  input.now_ms = row.now_ms;
  input.request = row.request;
  input.asker = row.asker;
  input.requestId = row.request_id;
  input.value = row.value;
  input.fact = row.fact;
  input.factValue = row.fact_value;
  input.benchFile = row.bench_file;
  input.manifest = row.manifest;
  return input;
}

interface RowReader {
  inputOf(i: number): number;
  fill(input: RecordedInput, i: number): void;
}

function rowReader(block: Block): RowReader {
  const column = (id: number): Float64Array => block.column(id) ?? new Float64Array(block.n);
  const numbers = column(ROW.input);
  const mono = column(ROW.mono_ms);
  const drift = column(ROW.drift);
  const jump = column(ROW.jump_ms);
  const gate = column(ROW.gate);
  const low = column(ROW.freshLow);
  const high = column(ROW.freshHigh);
  const plain = (
    ["seq", "tick", "status", "cause", "ackSeq", "ackAge_ticks", "conversions", "group"] as const
  ).map((name) => ({ name, values: column(ROW[name]) }));
  const channels = block.ids
    .filter((id) => id >= CHANNEL_COLUMN && id < CHANNEL_COLUMN + CHANNELS_MAX)
    .map((id) => ({ index: id - CHANNEL_COLUMN, values: column(id) }));
  return {
    inputOf: (i) => numbers[i] as number,
    fill(input, i) {
      clearRequest(input);
      input.n = numbers[i] as number;
      input.now_ms = mono[i] as number;
      input.drift = drift[i] as number;
      input.jump_ms = jump[i] as number;
      input.newest = (gate[i] as number) & 1;
      input.portDrained = ((gate[i] as number) >> 1) & 1;
      for (const { name, values } of plain) input.sample[name] = values[i] as number;
      for (const { index, values } of channels) {
        input.sample.values[index] = values[i] as number;
        input.sample.fresh[index] = isFresh(low[i] as number, high[i] as number, index) ? 1 : 0;
      }
    },
  };
}

function clearRequest(input: RecordedInput): void {
  input.kind = INPUT.sample;
  input.request = 0;
  input.asker = 0;
  input.requestId = 0;
  input.value = 0;
  input.fact = 0;
  input.factValue = 0;
}
