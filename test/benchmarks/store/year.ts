import Database from "better-sqlite3";
import { recordFile } from "../../../daemon/record/folder.ts";
import { BEGIN_ms, type RowShape } from "./noise.ts";
import { ask, scratch, write } from "./own.ts";

const SHAPE: RowShape = { channels: 7, rate_perS: 10, sigma: 2 };
const DAYS = 365;
const DAY_ms = 86_400_000;
/** Columns that move with the day, and by how much of it; other tables have no rows a day. */
const MOVED: Readonly<Record<string, Readonly<Record<string, string>>>> = {
  blocks: { id: "@id", t0: "@ms", t1: "@ms" },
  rollups: { id: "@id", block0: "@id", block1: "@id", t0: "@ms", t1: "@ms" },
  rollup_1min: { minute: "@ms / 60000" },
  rollup_1h: { hour: "@ms / 3600000" },
};

export interface Year {
  readonly bytes: number;
  readonly open_ms: number;
  readonly picture_ms: number;
}

/**
 * A data folder of a year at 10 samples a second: one recorded day, and copies of its rows on the 364
 * days before (their packed times stay the last day's, which neither sizes nor these questions see).
 */
export async function year(): Promise<Year> {
  const { folder, remove } = scratch();
  try {
    write(folder, SHAPE, 86_400 * SHAPE.rate_perS, 60_000);
    const db = new Database(recordFile(folder));
    db.pragma("synchronous = OFF");
    for (const table of Object.keys(MOVED)) {
      db.exec(`CREATE TEMP TABLE day_${table} AS SELECT * FROM ${table}`);
    }
    for (let day = 1; day < DAYS; day++) copyDay(db, day);
    const bytes =
      Number(db.pragma("page_count", { simple: true })) *
      Number(db.pragma("page_size", { simple: true }));
    db.close();
    const end_ms = BEGIN_ms + DAY_ms;
    const open = await ask(folder, 1 / 60, end_ms);
    const picture = await ask(folder, 24 * DAYS, end_ms);
    return { bytes, open_ms: open.cold_ms, picture_ms: picture.cold_ms };
  } finally {
    remove();
  }
}

function copyDay(db: Database.Database, day: number): void {
  db.transaction(() => {
    for (const [table, moved] of Object.entries(MOVED)) {
      const names = (db.pragma(`table_info(${table})`) as { name: string }[]).map((c) => c.name);
      const values = names.map((name) =>
        moved[name] === undefined ? name : `${name} + ${moved[name]}`,
      );
      db.prepare(`INSERT INTO ${table} (${names}) SELECT ${values} FROM day_${table}`).run({
        id: day * 1_000_000,
        ms: -day * DAY_ms,
      });
    }
  })();
}
