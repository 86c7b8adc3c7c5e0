import { PlaceFile, placeFile } from "./influx-place.ts";
import type { Store } from "./store.ts";

/** Name of the second home where retention asks what was carried elsewhere. */
export const SECOND_HOME = "influx";

/**
 * Writes down which stretches the second home has confirmed, for retention: of each run from its
 * first block to the last sample sent, and never beyond a block that was not sent whole.
 */
export function noteSent(store: Store, wall_ms: number): void {
  const place = new PlaceFile(placeFile(store.folder)).load();
  if (place === null) return;
  store.within((db) => {
    const stretch = db.prepare(
      `SELECT u.bench, min(b.t0) AS first,
         max(CASE WHEN b.input1 <= @input THEN b.t1 END) AS sent,
         min(CASE WHEN b.input1 > @input THEN b.t0 END) AS unsent
       FROM blocks b JOIN runs u ON u.id = b.run WHERE b.run = @run GROUP BY u.bench`,
    );
    const write = db.prepare("INSERT OR REPLACE INTO exported VALUES (?,?,?,?,?)");
    const runs = db.prepare("SELECT id FROM runs").pluck().all() as number[];
    for (const run of runs) {
      const isWhole = run <= place.runsDone;
      const input = isWhole ? Number.MAX_SAFE_INTEGER : (place.runs[run]?.input ?? -1);
      const found = stretch.get({ run, input }) as Stretch | undefined;
      if (found === undefined || found.sent === null) continue;
      const to = found.unsent === null ? found.sent : Math.min(found.sent, found.unsent - 1);
      if (to > found.first) write.run(found.bench, SECOND_HOME, found.first, to, wall_ms);
    }
  });
}

interface Stretch {
  readonly bench: string;
  readonly first: number;
  readonly sent: number | null;
  readonly unsent: number | null;
}
