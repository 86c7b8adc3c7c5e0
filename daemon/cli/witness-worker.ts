import { askWitnesses, type WitnessWork } from "./witnesses.ts";

/** The process of the witnesses. Started from dist/ by witnesses.ts. */
askWitnesses(JSON.parse(process.argv[2] ?? "") as WitnessWork);
