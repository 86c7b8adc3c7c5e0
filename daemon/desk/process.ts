import { runDesk, tellFailure } from "./run.ts";

runDesk(process.argv[2] ?? "{}").catch(tellFailure);
