import { type ChildProcess, spawn, spawnSync } from "node:child_process";
import { once } from "node:events";
import { chmodSync, mkdirSync, readFileSync, writeFileSync } from "node:fs";
import http from "node:http";
import https from "node:https";
import { type AddressInfo, createServer } from "node:net";
import { join } from "node:path";
import type { InfluxPart } from "../../daemon/model/bench.ts";

/** Real servers for tests: each in a folder of its own, on a free port of this machine alone. */

const START_ms_MAX = 15_000;

async function freePort(): Promise<number> {
  const server = createServer().listen(0, "127.0.0.1");
  await once(server, "listening");
  const { port } = server.address() as AddressInfo;
  server.close();
  await once(server, "close");
  return port;
}

/** A server that can be stopped and started again on the same port with the same data. */
export class RealServer {
  readonly part: InfluxPart;
  readonly folder: string;
  readonly #command: readonly string[];
  readonly #ping: () => Promise<boolean>;
  #child: ChildProcess | null = null;

  constructor(
    folder: string,
    part: InfluxPart,
    command: readonly string[],
    ping: () => Promise<boolean>,
  ) {
    this.folder = folder;
    this.part = part;
    this.#command = command;
    this.#ping = ping;
  }

  async start(): Promise<void> {
    const [program = "", ...options] = this.#command;
    const child = spawn(program, options, { stdio: ["ignore", "ignore", "pipe"] });
    let said = "";
    child.stderr?.on("data", (data) => {
      said = `${said}${data}`.slice(-2000);
    });
    this.#child = child;
    const end = performance.now() + START_ms_MAX;
    while (!(await this.#ping())) {
      if (child.exitCode !== null || performance.now() > end) {
        throw new Error(`${program} did not start: ${said}`);
      }
      await new Promise((resolve) => setTimeout(resolve, 20));
    }
  }

  /** As a machine that loses power would end it. */
  async stop(): Promise<void> {
    const child = this.#child;
    if (child === null || child.exitCode !== null || child.signalCode !== null) return;
    const exit = once(child, "exit");
    child.kill("SIGKILL");
    await exit;
    this.#child = null;
  }
}

export const USER = "writer";
export const PASSWORD = "its own, with a comma";

/** InfluxDB 1.x with TLS, authentication and one user; the credentials lie in a file of mode 0600. */
export async function influxServer(
  folder: string,
  dataLines: readonly string[] = [],
): Promise<RealServer> {
  mkdirSync(folder, { recursive: true });
  const port = await freePort();
  const ca = join(folder, "cert.pem");
  const key = join(folder, "key.pem");
  const made = spawnSync("openssl", [
    ...["req", "-x509", "-newkey", "ec", "-pkeyopt", "ec_paramgen_curve:prime256v1", "-nodes"],
    ...["-keyout", key, "-out", ca, "-days", "2", "-subj", "/CN=localhost"],
    ...["-addext", "subjectAltName=IP:127.0.0.1"],
  ]);
  if (made.status !== 0) throw new Error(`no certificate could be made: ${made.stderr}`);
  const file = join(folder, "influxdb.conf");
  const config = [
    "reporting-disabled = true",
    `bind-address = "127.0.0.1:${await freePort()}"`,
    `[meta]\ndir = "${folder}/meta"`,
    `[data]\ndir = "${folder}/data"\nwal-dir = "${folder}/wal"\nquery-log-enabled = false`,
    ...dataLines,
    "[monitor]\nstore-enabled = false",
    `[http]\nbind-address = "127.0.0.1:${port}"\nauth-enabled = true\nlog-enabled = false`,
    `https-enabled = true\nhttps-certificate = "${ca}"\nhttps-private-key = "${key}"`,
  ];
  writeFileSync(file, `${config.join("\n")}\n`);
  const credentials = join(folder, "credentials");
  writeFileSync(credentials, `${USER}\n${PASSWORD}\n`);
  chmodSync(credentials, 0o600);
  const part: InfluxPart = {
    url: `https://127.0.0.1:${port}`,
    database: "nights",
    server: "influxdb",
    keep_ms: null,
    caFile: ca,
    credentialsFile: credentials,
    pages: "record",
  };
  const ping = (): Promise<boolean> => answers(`${part.url}/ping`, ca);
  return new RealServer(folder, part, ["influxd", "run", "-config", file], ping);
}

/** VictoriaMetrics, one node, which keeps one of samples that are the same. */
export async function victoriaServer(folder: string): Promise<RealServer> {
  mkdirSync(folder, { recursive: true });
  const port = await freePort();
  const part: InfluxPart = {
    url: `http://127.0.0.1:${port}`,
    database: "nights",
    server: "victoria-metrics",
    keep_ms: null,
    caFile: null,
    credentialsFile: null,
    pages: "record",
  };
  const command = [
    "victoria-metrics",
    `-httpListenAddr=127.0.0.1:${port}`,
    `-storageDataPath=${folder}/data`,
    "-retentionPeriod=100y",
    "-dedup.minScrapeInterval=1ms",
    "-memory.allowedBytes=200MB",
  ];
  return new RealServer(folder, part, command, () => answers(`${part.url}/health`, null));
}

async function answers(url: string, ca: string | null): Promise<boolean> {
  try {
    await fetchText("GET", url, ca);
    return true;
  } catch {
    return false;
  }
}

/** A plain request, past the code under test; rejects for any answer but 2xx. */
export function fetchText(
  method: "GET" | "POST",
  url: string,
  ca: string | null,
  auth = "",
): Promise<string> {
  const isTls = url.startsWith("https:");
  const options = {
    method,
    auth,
    timeout: 60_000,
    ...(ca === null ? {} : { ca: readFileSync(ca) }),
  };
  return new Promise((resolve, reject) => {
    const asked = (isTls ? https : http).request(url, options, (answer) => {
      let out = "";
      answer.setEncoding("utf8");
      answer.on("data", (piece: string) => {
        out += piece;
      });
      answer.on("end", () => {
        const status = answer.statusCode ?? 0;
        if (status < 300) resolve(out);
        else reject(new Error(`${status}: ${out}`));
      });
    });
    asked.on("error", reject);
    asked.end();
  });
}

/** Rows of one InfluxQL question, past the code under test. */
export async function influxQl(server: RealServer, text: string): Promise<unknown[][]> {
  const { url, database, caFile } = server.part;
  const query = `${url}/query?db=${database}&epoch=ms&q=${encodeURIComponent(text)}`;
  const method = /^(create|drop|grant|alter)/i.test(text) ? "POST" : "GET";
  const answer = JSON.parse(await fetchText(method, query, caFile, `${USER}:${PASSWORD}`)) as {
    results: { series?: { values: unknown[][] }[]; error?: string }[];
  };
  const [result] = answer.results;
  if (result?.error !== undefined) throw new Error(result.error);
  return (result?.series ?? []).flatMap((series) => series.values);
}

/** The first user, who may do everything: InfluxDB lets it be made without a password. */
export const makeUser = (server: RealServer): Promise<unknown> =>
  influxQl(server, `CREATE USER "${USER}" WITH PASSWORD '${PASSWORD}' WITH ALL PRIVILEGES`);
