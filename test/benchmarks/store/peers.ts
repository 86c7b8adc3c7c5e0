import { type ChildProcess, spawn } from "node:child_process";
import { once } from "node:events";
import { mkdirSync, readdirSync, statSync, writeFileSync } from "node:fs";
import { type AddressInfo, createServer } from "node:net";
import { join } from "node:path";
import { BEGIN_ms, count, type RowShape } from "./noise.ts";

/** Other stores, as they come, given the same rows; each a real server on this machine alone. */
export interface Peer {
  readonly bytesPerValue: number;
  /** The day at 2,000 pixels, three channels, asked a second time, milliseconds. */
  readonly day_ms: number;
}

/** Rows a request: large enough that requests do not count, small enough for any server. */
const ROWS_A_REQUEST = 20_000;
const PIXELS = 2000;
const START_ms_MAX = 20_000;
const SETTLE_ms_MAX = 120_000;

/** Null where there is no such program here. */
export async function influx(root: string, shape: RowShape, rows: number): Promise<Peer | null> {
  const folder = join(root, "influx");
  mkdirSync(folder);
  const port = await freePort();
  const config = [
    "reporting-disabled = true",
    `bind-address = "127.0.0.1:${await freePort()}"`,
    `[meta]\ndir = "${folder}/meta"`,
    `[data]\ndir = "${folder}/data"\nwal-dir = "${folder}/wal"\nquery-log-enabled = false`,
    'cache-snapshot-write-cold-duration = "2s"\ncompact-full-write-cold-duration = "4s"',
    "[monitor]\nstore-enabled = false",
    `[http]\nbind-address = "127.0.0.1:${port}"\nlog-enabled = false`,
  ];
  writeFileSync(join(folder, "influxdb.conf"), config.join("\n"));
  const url = `http://127.0.0.1:${port}`;
  const options = ["run", "-config", join(folder, "influxdb.conf")];
  const server = await started("influxd", options, `${url}/ping`);
  if (server === null) return null;
  try {
    await posted(`${url}/query?q=${encodeURIComponent("CREATE DATABASE bench")}`, "");
    await fill(`${url}/write?db=bench&precision=ms`, shape, rows);
    // Compacted as it would be a few hours later, and the write-ahead log given back.
    const bytes = await settled(join(folder, "data"));
    const parts = ["c1", "c2", "c3"].map((c) => `min(${c}),mean(${c}),max(${c}),count(${c})`);
    const length_ms = (rows * 1000) / shape.rate_perS;
    const question =
      `SELECT ${parts.join(",")} FROM n WHERE time >= ${BEGIN_ms}ms ` +
      `AND time < ${BEGIN_ms + length_ms}ms GROUP BY time(${Math.ceil(length_ms / PIXELS)}ms)`;
    const ask = (): Promise<void> =>
      posted(`${url}/query?db=bench&epoch=ms&q=${encodeURIComponent(question)}`, "");
    return { bytesPerValue: bytes / rows / shape.channels, day_ms: await second(ask) };
  } finally {
    await stopped(server);
  }
}

/** Null where there is no such program here. */
export async function victoria(root: string, shape: RowShape, rows: number): Promise<Peer | null> {
  const folder = join(root, "victoria");
  const url = `http://127.0.0.1:${await freePort()}`;
  const options = [
    `-httpListenAddr=${url.slice("http://".length)}`,
    `-storageDataPath=${folder}`,
    "-retentionPeriod=100y",
    "-search.maxPointsPerTimeseries=100000",
    "-search.disableCache",
  ];
  const server = await started("victoria-metrics", options, `${url}/health`);
  if (server === null) return null;
  try {
    await fill(`${url}/write?db=bench&precision=ms`, shape, rows);
    await posted(`${url}/internal/force_flush`, null);
    await posted(`${url}/internal/force_merge`, null);
    const bytes = await settled(join(folder, "data"));
    const length_s = rows / shape.rate_perS;
    const step_s = length_s / PIXELS;
    const ask = async (): Promise<void> => {
      for (const over of ["min", "avg", "max", "count"]) {
        const query = `${over}_over_time({__name__=~"n_c[123]"}[${step_s}s]) keep_metric_names`;
        const range = `start=${BEGIN_ms / 1000}&end=${BEGIN_ms / 1000 + length_s}&step=${step_s}s`;
        await posted(`${url}/api/v1/query_range?query=${encodeURIComponent(query)}&${range}`, null);
      }
    };
    return { bytesPerValue: bytes / rows / shape.channels, day_ms: await second(ask) };
  } finally {
    await stopped(server);
  }
}

async function fill(url: string, shape: RowShape, rows: number): Promise<void> {
  for (let row = 0; row < rows; ) {
    const lines: string[] = [];
    for (const end = Math.min(rows, row + ROWS_A_REQUEST); row < end; row++) {
      const fields: string[] = [];
      for (let c = 0; c < shape.channels; c++) {
        fields.push(`c${c}=${count(row, c, shape.rate_perS, shape.sigma)}i`);
      }
      const at = BEGIN_ms + (row * 1000) / shape.rate_perS;
      lines.push(`n,bench=north ${fields.join(",")} ${at}`);
    }
    await posted(url, lines.join("\n"));
  }
}

/** Sends, reads the answer whole, and wants success. `body` null asks with GET. */
async function posted(url: string, body: string | null): Promise<void> {
  const answer = await fetch(url, body === null ? {} : { method: "POST", body });
  const text = await answer.text();
  if (!answer.ok) throw new Error(`${url} answers ${answer.status}: ${text.slice(0, 200)}`);
}

/** The second of two questions, so that nothing is read or compiled for the first time. */
async function second(ask: () => Promise<void>): Promise<number> {
  await ask();
  const began = performance.now();
  await ask();
  return performance.now() - began;
}

/** Bytes that a folder takes on the disk, once they have been the same for some looks. */
async function settled(folder: string): Promise<number> {
  const end = performance.now() + SETTLE_ms_MAX;
  let before = -1;
  for (let same = 0; same < 4 && performance.now() < end; ) {
    await new Promise((resolve) => setTimeout(resolve, 2500));
    const now = sizeOf(folder);
    same = now === before ? same + 1 : 0;
    before = now;
  }
  return before;
}

function sizeOf(folder: string): number {
  let bytes = 0;
  for (const entry of readdirSync(folder, { withFileTypes: true })) {
    const path = join(folder, entry.name);
    if (entry.isDirectory()) bytes += sizeOf(path);
    else bytes += 512 * (statSync(path, { throwIfNoEntry: false })?.blocks ?? 0);
  }
  return bytes;
}

async function freePort(): Promise<number> {
  const server = createServer().listen(0, "127.0.0.1");
  await once(server, "listening");
  const { port } = server.address() as AddressInfo;
  server.close();
  await once(server, "close");
  return port;
}

/** The program, once it answers; null where it is not installed. */
async function started(
  program: string,
  options: readonly string[],
  ping: string,
): Promise<ChildProcess | null> {
  const child = spawn(program, options, { stdio: "ignore" });
  const missing = once(child, "error").then(() => true);
  const spawned = once(child, "spawn").then(() => false);
  if (await Promise.race([missing, spawned])) return null;
  const end = performance.now() + START_ms_MAX;
  while (!(await answers(ping))) {
    if (child.exitCode !== null || performance.now() > end) {
      child.kill("SIGKILL");
      throw new Error(`${program} did not start`);
    }
    await new Promise((resolve) => setTimeout(resolve, 50));
  }
  return child;
}

const answers = (url: string): Promise<boolean> =>
  fetch(url).then(
    (answer) => answer.ok,
    () => false,
  );

async function stopped(child: ChildProcess): Promise<void> {
  const exit = once(child, "exit");
  child.kill("SIGKILL");
  await exit;
}
