import { readFileSync } from "node:fs";
import { userInfo } from "node:os";
import type { Command } from "commander";
import type { KeeperDone, KeeperRequest } from "../record/keeper-api.ts";
import { keep } from "../record/keeper-client.ts";
import { interruptible, Progress } from "./progress.ts";
import { codeOf, EXIT, print, printJson, Trouble } from "./say.ts";
import { SessionKept } from "./sessions-answers.ts";
import { momentOf, outOfRecord, type RecordOptions, recordCommandOf } from "./sessions-where.ts";
import { wholeOf } from "./values.ts";
import { recordFolder } from "./where.ts";

/** The parts of `sessions` that add to the record: through the daemon where one runs, else here. */

const SESSION_MAX = 1e9;

interface NoteOptions extends RecordOptions {
  readonly session?: string;
  readonly at?: string;
  readonly who?: string;
  readonly picture?: string;
}

/** `sessions note TEXT`: what a person saw, on the time axis. */
export const noteCommand = (): Command =>
  recordCommandOf("note", "keep a note on the time axis, with a picture if you like", [
    "sessions note fan cleaned",
    "sessions note crystal moved --session 4 --at 2026-12-01T22:10 --picture spot.png",
  ])
    .argument("<text...>", "the note")
    .option("--session <number>", "the session that it is about")
    .option("--at <time>", "when, where it is not now: 2026-12-01T22:10")
    .option("--who <name>", "who says so; your user name where left out")
    .option("--picture <file>", "a PNG or JPEG of at most 1 MiB")
    .action(async (words: string[], options: NoteOptions) => {
      const session =
        options.session === undefined
          ? null
          : wholeOf("--session", options.session, 1, SESSION_MAX);
      await keepAndTell("Writing", options, {
        verb: "note",
        session,
        wall_ms: options.at === undefined ? null : momentOf(options.at),
        who: options.who ?? userInfo().username,
        text: words.join(" "),
        picture: options.picture === undefined ? null : pictureOf(options.picture),
      });
    });

function pictureOf(file: string): string {
  try {
    return readFileSync(file).toString("base64");
  } catch (error) {
    throw new Trouble(
      `The picture ${file} cannot be read (${codeOf(error)}).`,
      "Name a PNG or JPEG file. Nothing was changed.",
    );
  }
}

interface TagOptions extends RecordOptions {
  readonly remove?: boolean;
}

/** `sessions tag N TAG`: a word by which it is found again. */
export const tagCommand = (): Command =>
  recordCommandOf("tag", "give a session a word by which it is found again", [
    "sessions tag 4 reference",
    "sessions tag 4 reference --remove",
  ])
    .argument("<session>", "its number")
    .argument("<tag...>", "1 to 40 letters, digits, spaces, points or dashes")
    .option("--remove", "take it away again")
    .action((session: string, words: string[], options: TagOptions) =>
      keepAndTell("Writing", options, {
        verb: "tag",
        session: wholeOf("The session", session, 1, SESSION_MAX),
        tag: words.join(" "),
        does: options.remove === true ? "remove" : "set",
      }),
    );

/** Has a request carried out and prints the answer. */
export async function keepAndTell(
  what: string,
  options: RecordOptions,
  request: KeeperRequest,
): Promise<void> {
  const { id, words } = await keepIn(options.data ?? recordFolder(options.on), what, request);
  if (options.json === true) printJson(SessionKept, { id, words });
  else print(words);
  process.exitCode = EXIT.done;
}

/** Has a request carried out in a data folder, with its progress told. Throws a Trouble. */
export async function keepIn(
  folder: string,
  what: string,
  request: KeeperRequest,
): Promise<KeeperDone> {
  const progress = new Progress(what);
  try {
    return await interruptible((signal) =>
      keep(folder, request, { signal, progress: (done) => progress.tell(done) }),
    );
  } catch (error) {
    throw outOfRecord(error);
  } finally {
    progress.end();
  }
}
