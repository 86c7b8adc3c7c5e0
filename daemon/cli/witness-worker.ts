import { workerData } from "node:worker_threads";
import { askWitnesses, type WitnessWork } from "./witnesses.ts";

/** The thread of the witnesses. Started from dist/ by witnesses.ts. */
askWitnesses(workerData as WitnessWork);
