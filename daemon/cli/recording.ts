import { JUDGE_VERSION } from "../judge/records.ts";
import type { Bench } from "../model/bench.ts";
import type { Ring } from "../model/ring.ts";
import { RecorderClient } from "../record/client.ts";
import { RecordProblem } from "../record/problem.ts";
import { SecondHomeClient } from "../record/second-home-client.ts";
import { Trouble } from "./say.ts";

/** The recorder of a running daemon, open. */
export interface Recording {
  readonly client: RecorderClient;
  readonly opened: Awaited<RecorderClient["opened"]>;
  /** The last words of the recorder, empty while all is well, and how far behind it was then. */
  readonly state: { words: string; behindRows: number };
}

/** Starts the recorder on a data folder. Throws a Trouble where the folder cannot be used. */
export async function startRecorder(
  folder: string,
  bench: Bench,
  benchText: string,
  ring: Ring,
): Promise<Recording> {
  const state = { words: "", behindRows: 0 };
  const client = new RecorderClient(
    { folder, bench: bench.name, benchText, judgeVersion: JUDGE_VERSION, ring: ring.memory },
    (message) => {
      if (message.kind === "state") {
        state.words = message.words;
        state.behindRows = ring.written - message.readRows;
      } else if (message.kind === "failed") {
        state.words = `${message.what} ${message.found} ${message.do}`;
      }
    },
  );
  try {
    return { client, opened: await client.opened, state };
  } catch (error) {
    if (error instanceof RecordProblem) {
      throw new Trouble(`${error.what} ${error.found}`, error.remedy);
    }
    throw error;
  }
}

/**
 * Starts writing the record to the server that the bench file names; null where it names none.
 * `say` hears each change: what stands in the way, and that all is well again.
 */
export function startSecondHome(
  folder: string,
  bench: Bench,
  say: (words: string, weight: "warn" | "calm") => void,
): SecondHomeClient | null {
  const { influx } = bench.record;
  if (influx === null) return null;
  return new SecondHomeClient(folder, influx, ({ words }) => {
    if (words !== "") say(words, "warn");
    else say(`The record reaches ${influx.url} again.`, "calm");
  });
}
