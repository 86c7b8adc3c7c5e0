import { workerData } from "node:worker_threads";
import { Ring, ROW, ROW_LENGTH } from "../../daemon/model/ring.ts";

/** A worker that fills a ring as fast as it can: every cell of a row says the row's number. */
const { memory, rows } = workerData as {
  readonly memory: SharedArrayBuffer;
  readonly rows: number;
};
const ring = new Ring(memory);
for (let n = 1; n <= rows; n++) {
  const at = ring.offset(ring.written);
  ring.cells.fill(n, at, at + ROW_LENGTH);
  ring.cells[at + ROW.freshHigh] = 0;
  ring.publish();
}
