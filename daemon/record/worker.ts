import { parentPort } from "node:worker_threads";
import { serve } from "./serve.ts";

/** The recorder's thread. Started from dist/ by client.ts. */
if (parentPort !== null) serve(parentPort);
