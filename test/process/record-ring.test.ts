import { once } from "node:events";
import { Worker } from "node:worker_threads";
import { expect, test } from "vitest";
import { builtFile } from "../../daemon/paths.ts";
import { openReader } from "../../daemon/record/reader.ts";
import { MANIFEST } from "../unit/record/row-maker.ts";
import { recording, scratchFolder } from "../unit/record/synthetic.ts";

/** A writer this much faster than the reader overtakes it all the time. */
const RING_ROWS = 8;
const ROWS = 3_000_000;

test("a row overwritten while it is copied is lost, never kept half old and half new", async () => {
  const { folder, remove } = scratchFolder();
  const { ring, recorder } = recording(folder, RING_ROWS);
  recorder.take({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
  const hammer = new Worker(builtFile("test/programs/ring-hammer.js"), {
    workerData: { memory: ring.memory, rows: ROWS },
  });
  const ended = once(hammer, "exit");
  while (ring.written < ROWS) recorder.drain();
  await ended;
  recorder.close();
  const reader = openReader(folder);
  let kept = 0;
  for (const input of reader.inputs(1)) {
    kept++;
    const cells = [input.now_ms, input.sample.seq, input.sample.tick, input.drift];
    const counts = MANIFEST.channels.map((channel) => input.sample.values[channel.index]);
    expect([...cells, ...counts]).toEqual(new Array(10).fill(input.n));
  }
  reader.close();
  remove();
  expect(kept).toBeGreaterThan(0);
  expect(kept + recorder.lostRows).toBe(ROWS);
  expect(recorder.lostRows).toBeGreaterThan(0);
});
