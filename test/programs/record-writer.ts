import { Ring, ringBytes } from "../../daemon/model/ring.ts";
import { mono, wall } from "../../daemon/model/times.ts";
import { RecorderClient } from "../../daemon/record/client.ts";
import { MANIFEST, publish, rowMaker } from "../unit/record/row-maker.ts";

/**
 * Records into a data folder as a daemon would, until it is killed: about 100 samples a second and
 * an event with every tenth, each named on stdout once it was handed over; the first is the arming.
 * For tests that kill it.
 */
const SAMPLE_ms = 10;
const SAMPLES_AN_EVENT = 10;

const [folder = ""] = process.argv.slice(2);
const ring = new Ring(new SharedArrayBuffer(ringBytes(6000)));
const client = new RecorderClient(
  { folder, bench: "north", benchText: "name: north\n", judgeVersion: 1, ring: ring.memory },
  say,
);

try {
  const { lastEventId } = await client.opened;
  record(lastEventId);
} catch (error) {
  say({ refused: error instanceof Error ? error.message : String(error) });
}

function say(what: unknown): void {
  process.stdout.write(`${JSON.stringify(what)}\n`);
}

function record(lastEventId: number): void {
  const started = Date.now();
  client.post({ kind: "manifest", ringRow: 0, manifest: { ...MANIFEST, rate_perS: 100 } });
  client.post({ kind: "session", ringRow: 0, session: "lit", at: wall(started) });
  const make = rowMaker(1, () => Date.now() - started, started);
  let samples = 0;
  postEvent(lastEventId + 1, "armed");
  say({ started });
  setInterval(() => {
    publish(ring, make(samples++));
    const id = lastEventId + 1 + samples / SAMPLES_AN_EVENT;
    if (samples % SAMPLES_AN_EVENT === 0) postEvent(id, "warning");
  }, SAMPLE_ms);
}

function postEvent(id: number, kind: "armed" | "warning"): void {
  const at = Date.now();
  const data = { words: "the case is warm" };
  const times = { mono: mono(performance.now()), wall: wall(at), tick: -1, input: 0 };
  client.post({
    kind: "event",
    event: { id, bench: "north", ...times, kind, hazard: "case-over", data },
  });
  say({ event: id, at });
}
