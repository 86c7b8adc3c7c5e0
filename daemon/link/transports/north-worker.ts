import { runNorth } from "./north-live.ts";

runNorth();
