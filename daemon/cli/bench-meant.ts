import { openReader } from "../record/reader.ts";
import { EXIT, Trouble } from "./say.ts";
import { outOfRecord } from "./sessions-where.ts";
import { lives, notices } from "./where.ts";

/** The bench whose record a folder is: as said, as running there, or the one recorded there last. */
export function benchMeant(folder: string, on: string | undefined): string {
  if (on !== undefined) return on;
  const running = notices().find((notice) => notice.folder === folder && lives(notice));
  if (running !== undefined) return running.bench;
  try {
    const reader = openReader(folder);
    try {
      const bench = reader.runs().at(-1)?.bench;
      if (bench !== undefined) return bench;
    } finally {
      reader.close();
    }
  } catch (error) {
    throw outOfRecord(error);
  }
  throw new Trouble("No bench was recorded there so far.", "Say which with --on.", EXIT.usage);
}
