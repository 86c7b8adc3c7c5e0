import { chmodSync, mkdirSync, readFileSync, writeFileSync } from "node:fs";
import { join } from "node:path";
import { gunzipSync } from "node:zlib";
import Database from "better-sqlite3";
import { afterEach, beforeEach, describe, expect, test } from "vitest";
import { packageRoot } from "../../../daemon/paths.ts";
import { openForReading } from "../../../daemon/record/folder.ts";
import { openReader } from "../../../daemon/record/reader.ts";
import { SCHEMA_VERSION } from "../../../daemon/record/schema.ts";
import { Store } from "../../../daemon/record/store.ts";
import { rowMaker } from "./row-maker.ts";
import { scratchFolder } from "./synthetic.ts";

/** As the program of schema version 1 wrote them: 200 samples of `rowMaker(11, …)`, one event. */
const VERSION_1 = join(packageRoot, "test/unit/record/data/version-1.sqlite.gz");
const maker = () => rowMaker(11, (i) => 50 * i + (i > 150 ? 60_000 : 0));

let scratch: ReturnType<typeof scratchFolder>;
beforeEach(() => {
  scratch = scratchFolder();
  mkdirSync(scratch.folder);
  writeFileSync(join(scratch.folder, "record.sqlite"), gunzipSync(readFileSync(VERSION_1)));
});
afterEach(() => scratch.remove());

/** Every input of the only run, as [number, time, first channel]. */
function inputs(): number[][] {
  const reader = openReader(scratch.folder);
  const found: number[][] = [];
  for (const i of reader.inputs(1)) found.push([i.n, i.now_ms, i.sample.values[0] as number]);
  reader.close();
  return found;
}

function made(): number[][] {
  const make = maker();
  return Array.from({ length: 200 }, (_, i) => {
    const row = make(i);
    return [row[0] as number, row[1] as number, row[24] as number];
  });
}

describe("a record of schema version 1", () => {
  test("is read as it is, without being changed", () => {
    const file = join(scratch.folder, "record.sqlite");
    chmodSync(file, 0o400);
    const before = readFileSync(file);
    expect(inputs()).toEqual(made());
    const db = openForReading(scratch.folder);
    for (const table of ["notes", "tags", "minutes", "hours", "rollups", "exported"]) {
      expect(db.prepare(`SELECT count(*) FROM ${table}`).pluck().get()).toBe(0);
    }
    db.close();
    expect(readFileSync(file).equals(before)).toBe(true);
  });

  test("is brought up to date when it is opened for writing, every sample and event kept", () => {
    Store.open(scratch.folder, { durability: "none" }).close();
    const db = new Database(join(scratch.folder, "record.sqlite"), { readonly: true });
    expect(db.pragma("user_version", { simple: true })).toBe(SCHEMA_VERSION);
    expect(db.prepare("SELECT count(*) FROM events").pluck().get()).toBe(1);
    expect(db.prepare("SELECT count(*) FROM notes").pluck().get()).toBe(0);
    db.close();
    expect(inputs()).toEqual(made());
  });
});
