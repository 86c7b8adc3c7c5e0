import { execFileSync } from "node:child_process";
import { readFileSync } from "node:fs";
import { join } from "node:path";
import Database from "better-sqlite3";
import { afterAll, beforeAll, expect, test } from "vitest";
import { packageRoot } from "../../../daemon/paths.ts";
import { Block } from "../../../daemon/record/blocks.ts";
import { recordFile } from "../../../daemon/record/folder.ts";
import { rowMaker } from "./row-maker.ts";
import { recordRows, scratchFolder } from "./synthetic.ts";

const reader = join(packageRoot, "test/unit/record/read_blocks.py");
const scratch = scratchFolder();

beforeAll(() => {
  // Steady times for the line, a gap for the escapes, and enough rows for a table of frequencies.
  const make = rowMaker(5, (i) => 20 * i + (i > 2000 ? 9000 : 0));
  recordRows(scratch.folder, (i) => make(i), 3000);
});
afterAll(() => scratch.remove());

test.each(["blocks", "rollups"])(
  "a reader in Python, made from BLOCKS.md alone, reads every column of %s",
  (table) => {
    const printed = execFileSync("python3", [reader, recordFile(scratch.folder), table], {
      encoding: "utf8",
      maxBuffer: 2 ** 28,
    });
    const db = new Database(recordFile(scratch.folder), { readonly: true });
    const row = db.prepare(`SELECT codec, crc, blob FROM ${table} WHERE rowid = ?`);
    let columns = 0;
    for (const line of printed.trim().split("\n")) {
      const found = JSON.parse(line.replaceAll("NaN", "null")) as {
        block: number;
        column: number;
        values: (number | null)[];
      };
      const stored = row.get(found.block) as { codec: number; crc: number; blob: Uint8Array };
      expect(stored.codec).toBe(1);
      const block = Block.open(stored.codec, stored.crc, stored.blob);
      if ("fault" in block) throw new Error(block.fault);
      const wanted = [...(block.column(found.column) ?? [])];
      expect(found.values.map((v) => v ?? Number.NaN)).toEqual(wanted);
      columns++;
    }
    expect(columns).toBeGreaterThan(30);
    db.close();
  },
);

test("that reader stays short enough to be read at one go, and needs nothing but Python", () => {
  const lines = readFileSync(reader, "utf8").split("\n");
  expect(lines.filter((line) => line.trim() !== "").length).toBeLessThanOrEqual(80);
  expect(lines.filter((line) => /^(import|from) /.test(line))).toEqual([
    "import json, math, sqlite3, struct, sys, zlib",
  ]);
});
