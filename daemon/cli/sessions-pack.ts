import { statSync } from "node:fs";
import { resolve } from "node:path";
import type { Command } from "commander";
import { makePack } from "../record/pack.ts";
import type { RecordReader, SessionRow } from "../record/reader.ts";
import { carryOut } from "./progress.ts";
import { EXIT, print, printJson, Trouble } from "./say.ts";
import { SessionPacked } from "./sessions-answers.ts";
import { keepAndTell } from "./sessions-keep.ts";
import { reading } from "./sessions-lines.ts";
import { type RecordOptions, recordCommandOf, sessionNumber } from "./sessions-where.ts";

/** One portable file of a session, out and back in. A pack is read like a folder, with --data. */

interface PackOptions extends RecordOptions {
  readonly session?: string;
}

/** `sessions pack FILE`: one portable file. */
export const packCommand = (): Command =>
  recordCommandOf(
    "pack",
    "one portable file of a session: samples, events, bench file, notes, hashes",
    ["sessions pack night.bsp --session 4"],
  )
    .argument("<file>", "where to write; a file that is there is left alone")
    .option("--session <number>", "which session; the newest where none is named")
    .action((file: string, options: PackOptions) =>
      reading(options, async ({ reader }) => {
        const { id } = chosen(options.session, reader);
        const work = makePack(reader.parts().db, id, file, Date.now());
        const { bench, session } = await carryOut("Packing", work);
        const bytes = statSync(file).size;
        if (options.json === true) printJson(SessionPacked, { file, bench, session, bytes });
        else print(`Session ${session} of ${bench} is in ${file} (${bytes} bytes).`);
      }),
    );

function chosen(text: string | undefined, reader: RecordReader): SessionRow {
  if (text !== undefined) return sessionNumber(text, reader);
  const last = reader.sessions().at(-1);
  if (last !== undefined) return last;
  throw new Trouble("Nothing is recorded yet.", "There is no session to pack.", EXIT.refused);
}

/** `sessions unpack FILE`: a packed session comes back, here or elsewhere. */
export const unpackCommand = (): Command =>
  recordCommandOf("unpack", "bring a packed session into this record, its samples as they were", [
    "sessions unpack night.bsp --on north",
    "sessions unpack night.bsp --data old-nights",
  ])
    .argument("<file>", "a file that sessions pack wrote")
    .action((file: string, options: RecordOptions) =>
      keepAndTell("Unpacking", options, { verb: "unpack", file: resolve(file) }),
    );
