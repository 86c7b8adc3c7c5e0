import { crc32 } from "node:zlib";
import { readPacked, writePacked } from "./codec-packed.ts";
import { readPlain, writePlain } from "./codec-plain.ts";

/**
 * Blocks of columns, in two codecs, laid out byte by byte in BLOCKS.md; any column can be read
 * alone, and values come back bit for bit, NaN included. Codec 0 is quick to write: it holds the
 * tail. Codec 1 is small. Codec 255 is a block whose full rate was retired: it has no bytes.
 */
export const CODEC = { plain: 0, packed: 1, retired: 255 } as const;

/** One named row of numbers; `values` may be longer than the block. */
export interface Column {
  /** 0 … 65535; see columns.ts and rollup.ts. */
  readonly id: number;
  readonly values: Float64Array;
}

/** How to read each column of a blob; null where its bytes make no sense. */
export type Columns = ReadonlyMap<number, () => Float64Array | null>;

export interface Coded {
  readonly codec: number;
  readonly blob: Uint8Array;
  readonly crc: number;
}

/** Why a block cannot be read. A value, not an exception: the rest of the record is served. */
export type BlockFault = { readonly fault: string };

/** Writes rows `from` … `to` (not included) of all columns with codec 0. */
export function encodeColumns(columns: readonly Column[], from: number, to: number): Coded {
  const blob = writePlain(columns, from, to);
  return { codec: CODEC.plain, blob, crc: crc32(blob) };
}

/** Packs rows `from` … `to` (not included, VALUES_MAX at most) of all columns with codec 1. */
export function packColumns(columns: readonly Column[], from: number, to: number): Coded {
  const blob = writePacked(columns, from, to);
  return { codec: CODEC.packed, blob, crc: crc32(blob) };
}

/** A block opened for reading: its columns are decoded one at a time, when asked for. */
export class Block {
  readonly n: number;
  readonly #columns: Columns;

  private constructor(n: number, columns: Columns) {
    this.n = n;
    this.#columns = columns;
  }

  /** Checks codec, checksum and that every column lies inside the blob. */
  static open(codec: number, crc: number, blob: Uint8Array): Block | BlockFault {
    if (codec === CODEC.retired) return { fault: "its full rate was retired" };
    if (codec !== CODEC.plain && codec !== CODEC.packed) {
      return { fault: `its codec is ${codec}; codecs up to ${CODEC.packed} are known here` };
    }
    const found = crc32(blob);
    if (found !== crc) return { fault: `its checksum is ${found}, ${crc} was stored` };
    const read = codec === CODEC.plain ? readPlain(blob) : readPacked(blob);
    return "fault" in read ? read : new Block(read.n, read.columns);
  }

  has(id: number): boolean {
    return this.#columns.has(id);
  }

  get ids(): number[] {
    return [...this.#columns.keys()];
  }

  /** The values of a column, or null where this block has none of that id. */
  column(id: number): Float64Array | null {
    return this.#columns.get(id)?.() ?? null;
  }
}
