import { execFileSync } from "node:child_process";
import { mkdtempSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { ROW } from "../../daemon/model/ring.ts";
import { openForReading } from "../../daemon/record/folder.ts";
import { PlaceFile, placeFile } from "../../daemon/record/influx-place.ts";
import { InfluxServer } from "../../daemon/record/influx-server.ts";
import { SecondHome } from "../../daemon/record/second-home.ts";
import {
  fetchText,
  influxServer,
  makeUser,
  type RealServer,
  victoriaServer,
} from "../process/influx-servers.ts";
import { type RowMaker, rowMaker, seeded } from "../unit/record/row-maker.ts";
import { recordRows } from "../unit/record/synthetic.ts";

/**
 * How many bytes a second home keeps: an hour at 50 samples/s, four channels in each sample and two
 * slow ones, noise of 2 counts, receipt jittered by a millisecond. Prints what SECOND-HOME.md says.
 */
const COUNT = 50 * 3600;
/** Until the servers have packed what they were given; they tell nobody when they have. */
const PACKED_ms = 30_000;

function noisyRows(): RowMaker {
  const random = seeded(3);
  const make = rowMaker(1, (i) => i * 20 + Math.floor(random() * 2));
  const noise = (): number => {
    let sum = 0;
    for (let i = 0; i < 12; i++) sum += random();
    return 2 * (sum - 6);
  };
  let drift = 0;
  return (i) => {
    const row = make(i);
    drift += (random() - 0.5) * 0.01;
    for (const index of [1, 2, 3, 4, 40]) {
      row[ROW.values + index] = Math.round(2000 + drift + noise());
    }
    row[ROW.values] = 2000;
    row[ROW.freshLow] = 0b1111 | (i % 10 === 0 ? 16 : 0);
    row[ROW.freshHigh] = i % 10 === 5 ? 256 : 0;
    row[ROW.asked_mA] = 1800;
    row[ROW.aim_mA] = 1800;
    row[ROW.ceiling_mA] = 1900 + Math.round(drift);
    row[ROW.expected_mW] = 1000 + Math.round(drift * 10) / 10;
    row[ROW.mono_ms] = 1000 + i * 20 + random() * 2;
    return row;
  };
}

const bytesOf = (path: string): number =>
  Number(execFileSync("du", ["-sb", path]).toString().split("\t")[0]);

async function send(folder: string, server: RealServer): Promise<void> {
  const db = openForReading(folder);
  const there = new InfluxServer(server.part, "none");
  const keeper = new PlaceFile(placeFile(folder));
  const home = new SecondHome((work) => work(db), there, keeper, server.part.url);
  const began = process.cpuUsage();
  while (await home.step());
  const { user, system } = process.cpuUsage(began);
  db.close();
  process.stdout.write(
    `${server.part.server}: ${((user + system) / COUNT).toFixed(1)} us of a core a sample\n`,
  );
}

const pause = (ms: number): Promise<void> => new Promise((resolve) => setTimeout(resolve, ms));
const tell = (what: string, bytes: number): void =>
  void process.stdout.write(`${what}: ${(bytes / COUNT).toFixed(2)} bytes a sample\n`);

const root = mkdtempSync(join(tmpdir(), "beamsitter-bytes-"));
const folder = join(root, "data");
recordRows(folder, noisyRows(), COUNT);
tell("the record itself", bytesOf(folder));

const influx = await influxServer(join(root, "influx"), [
  'cache-snapshot-write-cold-duration = "5s"',
  'compact-full-write-cold-duration = "5s"',
]);
await influx.start();
await makeUser(influx);
await send(folder, influx);
await pause(PACKED_ms);
tell("influxdb", bytesOf(join(influx.folder, "data/nights/autogen")));
await influx.stop();

const victoria = await victoriaServer(join(root, "victoria"));
await victoria.start();
await send(folder, victoria);
await fetchText("GET", `${victoria.part.url}/internal/force_flush`, null);
await fetchText("GET", `${victoria.part.url}/internal/force_merge`, null);
await pause(PACKED_ms);
tell("victoria-metrics", bytesOf(join(victoria.folder, "data/data")));
await victoria.stop();
rmSync(root, { recursive: true, force: true });
