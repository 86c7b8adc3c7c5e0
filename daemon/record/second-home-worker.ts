import { parentPort } from "node:worker_threads";
import { runSecondHome } from "./second-home-run.ts";

/** The second home's thread. Started from dist/ by second-home-client.ts. */
if (parentPort !== null) runSecondHome(parentPort);
