import { fork } from "node:child_process";
import { fileURLToPath } from "node:url";
import { Witness } from "../link/transports/witness.ts";
import { calibrationWords, type WitnessSpec } from "../model/witness.ts";
import { builtFile } from "../paths.ts";
import { keep } from "../record/keeper-client.ts";
import { reasonOf } from "./say.ts";

/** What the process of the witnesses is started with. */
export interface WitnessWork {
  readonly bench: string;
  readonly folder: string;
  readonly witnesses: readonly WitnessSpec[];
}

/**
 * Asks the instruments in a process of its own, which hands every reading to the recorder by its
 * socket: nothing of it touches the judging thread but a sentence where something changes. No thread,
 * because the serial ports' library ends the whole process when a thread that has one open ends.
 */
export function startWitnesses(work: WitnessWork, say: (words: string) => void): () => void {
  if (work.witnesses.length === 0) return () => {};
  const child = fork(
    fileURLToPath(builtFile("daemon/cli/witness-worker.js")),
    [JSON.stringify(work)],
    // Ctrl-C at the terminal is for the daemon, which then ends its witnesses.
    { stdio: ["ignore", "ignore", "inherit", "ipc"], execArgv: [], detached: true },
  );
  let ended = false;
  child.on("message", (words: string) => say(words));
  child.on("error", (error) => say(`The witnesses are not asked: ${reasonOf(error)}.`));
  child.on("exit", () => {
    if (!ended) say("The witnesses are no longer asked: their process ended. Restart the daemon.");
  });
  return () => {
    ended = true;
    child.kill("SIGKILL");
  };
}

/** The other end: runs until the daemon ends it, or is gone. */
export function askWitnesses({ bench, folder, witnesses }: WitnessWork): void {
  process.on("disconnect", () => process.exit());
  const say = (name: string, words: string): void => {
    if (process.connected) process.send?.(`Witness ${name}: ${words}`);
  };
  for (const spec of witnesses) {
    const { name, unit, due } = spec;
    if (due !== null && due < new Date().toISOString().slice(0, 10)) {
      say(name, `its calibration was due on ${due}.`);
    }
    let isFirst = true;
    let trouble = "";
    const reading = (value: number, identity: string): void => {
      // Who it is and how it is calibrated stands beside the first reading of each connection.
      const about = [identity, calibrationWords(spec)].filter((words) => words !== "").join("; ");
      const note = isFirst ? about.slice(0, 400) : "";
      isFirst = false;
      const facts = { bench, name, value, unit, typed: false, note, who: "", wall_ms: Date.now() };
      const keeping = { progress: () => {}, signal: new AbortController().signal };
      keep(folder, { verb: "reading", ...facts }, keeping).then(
        () => {
          trouble = "";
        },
        (error) => {
          const words = `a reading is not kept: ${reasonOf(error)}`;
          if (words !== trouble) say(name, words);
          trouble = words;
        },
      );
    };
    const state = (words: string): void => {
      if (words !== "") isFirst = true;
      say(name, words === "" ? "it answers; its readings are recorded." : words);
    };
    new Witness(spec, { reading, state }).start();
  }
}
