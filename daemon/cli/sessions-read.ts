import type { Command } from "commander";
import { verify } from "../record/verify.ts";
import { carryOut } from "./progress.ts";
import { EXIT, print, printJson } from "./say.ts";
import { SessionList, SessionShown, SessionsVerified } from "./sessions-answers.ts";
import { linesOf, reading, shownOf } from "./sessions-lines.ts";
import { type RecordOptions, recordCommandOf, sessionNumber } from "./sessions-where.ts";
import { LIST_HEAD, listLine, shownLines } from "./sessions-words.ts";
import { wholeOf } from "./values.ts";

/** The parts of `sessions` that only read; a pack is read like a folder, with --data FILE. */

const LIST_LENGTH = 30;

interface ListOptions extends RecordOptions {
  readonly last?: string;
}

/** `sessions`: when, how long, at which current, what became of the output, trips and notes. */
export const listAction = async (options: ListOptions): Promise<void> =>
  reading(options, async (read) => {
    const most = options.last === undefined ? LIST_LENGTH : wholeOf("--last", options.last, 1, 1e6);
    const all = read.reader.sessions();
    const lines = await linesOf(read, all.slice(-most));
    if (options.json === true) printJson(SessionList, lines);
    else if (all.length === 0) print("Nothing is recorded yet.");
    else {
      print(LIST_HEAD);
      for (const line of lines) print(listLine(line));
      if (all.length > most) print(`The last ${most} of ${all.length}; more with --last.`);
    }
  });

/** `sessions show N`: one session whole. */
export const showCommand = (): Command =>
  recordCommandOf("show", "everything about one session", ["sessions show 4"])
    .argument("<session>", "its number, as the list has it")
    .action((text: string, options: RecordOptions) =>
      reading(options, async (read) => {
        const shown = await shownOf(read, sessionNumber(text, read.reader));
        if (options.json === true) printJson(SessionShown, shown);
        else for (const line of shownLines(shown)) print(line);
      }),
    );

/** `sessions verify [N]`: every block's checksum, gaps and counts. */
export const verifyCommand = (): Command =>
  recordCommandOf("verify", "check every block, gap and count of the record, or of one session", [
    "sessions verify",
    "sessions verify 4 --json",
  ])
    .argument("[session]", "only this one")
    .action((text: string | undefined, options: RecordOptions) =>
      reading(options, async ({ reader }) => {
        const id = text === undefined ? undefined : sessionNumber(text, reader).id;
        const found = await carryOut("Checking", verify(reader.parts().db, id));
        const ok = found.faults.length === 0;
        if (options.json === true)
          printJson(SessionsVerified, { ...found, ok, faults: [...found.faults] });
        else {
          for (const fault of found.faults) print(`Damaged: ${fault}.`);
          print(
            `${found.samples} samples in ${found.blocks} blocks of ${found.sessions} sessions read, ${found.gaps} gaps: ${ok ? "all is well." : `${found.faults.length} faults; the rest is served.`}`,
          );
        }
        process.exitCode = ok ? EXIT.done : EXIT.refused;
      }),
    );
