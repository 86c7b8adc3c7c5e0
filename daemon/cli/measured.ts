import { existsSync } from "node:fs";
import { wall } from "../model/times.ts";
import { recordFile } from "../record/folder.ts";
import { RecordProblem } from "../record/problem.ts";
import { openReader } from "../record/reader.ts";
import { dataFolder } from "./where.ts";

/** What is older says more about a cable that is gone than about this bench. */
const WEEK_ms = 7 * 24 * 3_600_000;

/**
 * The worst age of a permit on its arrival that the bench's record of the last week holds, ms;
 * null where there is no record, or nothing in it. A record that cannot be read is no measurement.
 */
export async function worstPermitAge_ms(bench: string): Promise<number | null> {
  const folder = dataFolder(bench);
  if (!existsSync(recordFile(folder))) return null;
  const to = Date.now();
  const window = { from: wall(to - WEEK_ms), to: wall(to) };
  try {
    const reader = openReader(folder);
    try {
      const channels = ["link.loopDelay"];
      const answer = await reader.series({ bench, channels, window, pixels: 1 });
      const worst = Math.max(...(answer.channels["link.loopDelay"]?.max ?? []));
      return worst >= 0 ? worst : null;
    } finally {
      reader.close();
    }
  } catch (error) {
    if (error instanceof RecordProblem) return null;
    throw error;
  }
}
