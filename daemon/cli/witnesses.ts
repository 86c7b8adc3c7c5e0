import { parentPort, Worker } from "node:worker_threads";
import { Witness } from "../link/transports/witness.ts";
import { calibrationWords, type WitnessSpec } from "../model/witness.ts";
import { builtFile } from "../paths.ts";
import { keep } from "../record/keeper-client.ts";
import { reasonOf } from "./say.ts";

/** What the thread of the witnesses is started with. */
export interface WitnessWork {
  readonly bench: string;
  readonly folder: string;
  readonly witnesses: readonly WitnessSpec[];
}

/**
 * Asks the instruments in a thread of their own, which hands every reading to the recorder by its
 * socket: nothing of it touches the judging thread but a sentence where something changes.
 */
export function startWitnesses(work: WitnessWork, say: (words: string) => void): () => void {
  if (work.witnesses.length === 0) return () => {};
  const worker = new Worker(builtFile("daemon/cli/witness-worker.js"), { workerData: work });
  worker.on("message", (words: string) => say(words));
  worker.on("error", (error) => say(`The witnesses are no longer asked: ${reasonOf(error)}`));
  return () => void worker.terminate();
}

/** The other end: runs until the thread is ended. */
export function askWitnesses({ bench, folder, witnesses }: WitnessWork): void {
  const say = (name: string, words: string): void =>
    parentPort?.postMessage(`Witness ${name}: ${words}`);
  const keeping = { progress: () => {}, signal: new AbortController().signal };
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
