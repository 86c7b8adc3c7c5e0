import type { BlockFault, Column, Columns } from "./blocks.ts";

/**
 * Block codec 0: columns of integers, each as narrow as its own range allows. BLOCKS.md has the
 * layout byte by byte.
 */
const HEADER_BYTES = 8;
const ENTRY_BYTES = 16;
const FORM = { constant: 0, u8: 1, u16: 2, u32: 4, f64: 8 } as const;
type Form = (typeof FORM)[keyof typeof FORM];

/** Rows `from` … `to` (not included) of all columns. */
export function writePlain(columns: readonly Column[], from: number, to: number): Uint8Array {
  const n = to - from;
  const shapes = columns.map((column) => shapeOf(column.values, from, to));
  let size = HEADER_BYTES + columns.length * ENTRY_BYTES;
  for (const shape of shapes) size += shape.form * n;
  const blob = new Uint8Array(size);
  const view = new DataView(blob.buffer);
  view.setUint32(0, n, true);
  view.setUint16(4, columns.length, true);
  let offset = HEADER_BYTES + columns.length * ENTRY_BYTES;
  columns.forEach((column, i) => {
    const { form, base } = shapes[i] as Shape;
    const entry = HEADER_BYTES + i * ENTRY_BYTES;
    view.setUint16(entry, column.id, true);
    view.setUint8(entry + 2, form);
    view.setUint32(entry + 4, offset, true);
    view.setFloat64(entry + 8, base, true);
    writeColumn(view, offset, column.values.subarray(from, to), form, base);
    offset += form * n;
  });
  return blob;
}

interface Shape {
  readonly form: Form;
  readonly base: number;
}

function shapeOf(values: Float64Array, from: number, to: number): Shape {
  const first = from < to ? (values[from] as number) : 0;
  let least = first;
  let most = first;
  let constant = true;
  for (let i = from; i < to; i++) {
    const value = values[i] as number;
    if (constant && !Object.is(value, first)) constant = false;
    if (!Number.isSafeInteger(value) || Object.is(value, -0)) {
      if (!constant) return { form: FORM.f64, base: 0 };
      continue;
    }
    if (value < least) least = value;
    if (value > most) most = value;
  }
  if (constant) return { form: FORM.constant, base: first };
  // A first value that is no integer is only seen as such here: the loop compares with it.
  if (!Number.isSafeInteger(first) || Object.is(first, -0)) return { form: FORM.f64, base: 0 };
  const range = most - least;
  if (range < 0x100) return { form: FORM.u8, base: least };
  if (range < 0x10000) return { form: FORM.u16, base: least };
  if (range < 0x100000000) return { form: FORM.u32, base: least };
  return { form: FORM.f64, base: 0 };
}

function writeColumn(
  view: DataView,
  offset: number,
  values: Float64Array,
  form: Form,
  base: number,
): void {
  const n = values.length;
  if (form === FORM.u8) {
    for (let i = 0; i < n; i++) view.setUint8(offset + i, (values[i] as number) - base);
  } else if (form === FORM.u16) {
    for (let i = 0; i < n; i++) view.setUint16(offset + 2 * i, (values[i] as number) - base, true);
  } else if (form === FORM.u32) {
    for (let i = 0; i < n; i++) view.setUint32(offset + 4 * i, (values[i] as number) - base, true);
  } else if (form === FORM.f64) {
    for (let i = 0; i < n; i++) view.setFloat64(offset + 8 * i, values[i] as number, true);
  }
}

/** How to read each column, once it is checked that all lie inside the blob. */
export function readPlain(blob: Uint8Array): { n: number; columns: Columns } | BlockFault {
  if (blob.length < HEADER_BYTES) return { fault: "it is shorter than its header" };
  const view = new DataView(blob.buffer, blob.byteOffset, blob.byteLength);
  const n = view.getUint32(0, true);
  const count = view.getUint16(4, true);
  if (HEADER_BYTES + count * ENTRY_BYTES > blob.length) {
    return { fault: "it is shorter than its directory" };
  }
  const columns = new Map<number, () => Float64Array>();
  for (let i = 0; i < count; i++) {
    const entry = HEADER_BYTES + i * ENTRY_BYTES;
    const end = view.getUint32(entry + 4, true) + view.getUint8(entry + 2) * n;
    if (end > blob.length) return { fault: `its column ${i} ends outside it` };
    columns.set(view.getUint16(entry, true), () => readColumn(view, entry, n));
  }
  return { n, columns };
}

function readColumn(view: DataView, entry: number, n: number): Float64Array {
  const form = view.getUint8(entry + 2);
  const offset = view.getUint32(entry + 4, true);
  const base = view.getFloat64(entry + 8, true);
  const values = new Float64Array(n);
  if (form === FORM.constant) values.fill(base);
  else if (form === FORM.u8) {
    for (let i = 0; i < n; i++) values[i] = base + view.getUint8(offset + i);
  } else if (form === FORM.u16) {
    for (let i = 0; i < n; i++) values[i] = base + view.getUint16(offset + 2 * i, true);
  } else if (form === FORM.u32) {
    for (let i = 0; i < n; i++) values[i] = base + view.getUint32(offset + 4 * i, true);
  } else {
    for (let i = 0; i < n; i++) values[i] = view.getFloat64(offset + 8 * i, true);
  }
  return values;
}
