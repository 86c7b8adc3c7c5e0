import { wall } from "../../daemon/model/times.ts";
import { openReader } from "../../daemon/record/reader.ts";
import { BEGIN_ms } from "./store/noise.ts";
import { BENCH } from "./store/own.ts";

/** Asks the record in the folder named for everything it has, at every zoom, until it is ended. */
const [folder = ""] = process.argv.slice(2);
const reader = openReader(folder);
for (;;) {
  for (const minutes of [120, 30, 10, 1]) {
    const window = { from: wall(BEGIN_ms), to: wall(BEGIN_ms + minutes * 60_000) };
    await reader.series({ bench: BENCH, channels: ["c1", "c2", "c3"], window, pixels: 2000 });
  }
}
