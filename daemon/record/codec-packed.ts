import type { BlockFault, Column, Columns } from "./blocks.ts";
import { ByteReader, ByteWriter } from "./bytes.ts";
import { packColumn, unpackColumn } from "./packed.ts";
import { VALUES_MAX } from "./rans.ts";

/** Block codec 1: a directory of columns, then each as packed.ts makes it. */
export function writePacked(columns: readonly Column[], from: number, to: number): Uint8Array {
  const directory = new ByteWriter();
  const bodies = new ByteWriter();
  directory.varint(to - from);
  directory.varint(columns.length);
  let before = 0;
  for (const { id, values } of columns) {
    const begin = bodies.length;
    packColumn(bodies, values, from, to);
    directory.signed(id - before);
    directory.varint(bodies.length - begin);
    before = id;
  }
  directory.bytes(bodies.written);
  return directory.written.slice();
}

/** How to read each column, once it is checked that all lie inside the blob. */
export function readPacked(blob: Uint8Array): { n: number; columns: Columns } | BlockFault {
  const directory = new ByteReader(blob);
  const n = directory.varint();
  const count = directory.varint();
  if (n > VALUES_MAX || count > 65_536) return { fault: "its header makes no sense" };
  const lengths: { id: number; length: number }[] = [];
  let id = 0;
  for (let i = 0; i < count; i++) {
    id += directory.signed();
    lengths.push({ id, length: directory.varint() });
    if (directory.overrun) return { fault: "it is shorter than its directory" };
  }
  let position = directory.position;
  const columns = new Map<number, () => Float64Array | null>();
  for (const { id: column, length } of lengths) {
    const body = blob.subarray(position, position + length);
    if (body.length !== length) return { fault: `its column ${column} ends outside it` };
    columns.set(column, () => unpackColumn(new ByteReader(body), n));
    position += length;
  }
  return { n, columns };
}
