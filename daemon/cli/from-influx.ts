import { mkdtempSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { parseBench } from "../bench-file/parse.ts";
import type { Bench } from "../model/bench.ts";
import { CREDENTIALS_FILE } from "../record/influx-credentials.ts";
import { fetchHome } from "../record/influx-fetch.ts";
import { InfluxServer } from "../record/influx-server.ts";
import { HomeTrouble } from "../record/influx-trouble.ts";
import { openReader } from "../record/reader.ts";
import { loadBench } from "./bench-text.ts";
import { EXIT, Trouble } from "./say.ts";
import { momentOf } from "./sessions-where.ts";
import { recordFolder } from "./where.ts";

/** What of a command line says which samples are to come from the server. */
export interface HomeOptions {
  readonly on?: string;
  readonly data?: string;
  readonly session?: string;
  readonly from?: string;
  readonly to?: string;
  /** Bench file that names the server, where no record here does. */
  readonly bench?: string;
}

/** A folder with what was fetched; `remove` takes it away again. */
export interface Fetched {
  readonly folder: string;
  readonly remove: () => void;
}

/** Whether `--from` asks for the second home: `influx`, or `influx:` and a moment. */
export const isFromInflux = (from: string | undefined): boolean =>
  from !== undefined && /^influx(:|$)/.test(from);

/** Fetches the samples meant from the server into a folder of their own. Throws a Trouble. */
export async function fetchMeant(options: HomeOptions): Promise<Fetched> {
  const { bench, folder } = benchMeant(options);
  const { influx } = bench.record;
  if (influx === null) {
    throw new Trouble(
      `The bench file of ${bench.name} names no server that keeps the record a second time.`,
      "Name one in it (record: influx: url: …), or a bench file that does with --bench.",
      EXIT.usage,
    );
  }
  const since = options.from?.slice("influx:".length) ?? "";
  const filter = {
    bench: bench.name,
    ...(options.session === undefined ? {} : { session: sessionOf(options.session) }),
    ...(since === "" ? {} : { from: momentOf(since) }),
    ...(options.to === undefined ? {} : { to: momentOf(options.to) }),
  };
  const root = mkdtempSync(join(tmpdir(), "beamsitter-fetched-"));
  const remove = (): void => rmSync(root, { recursive: true, force: true });
  try {
    const fetched = join(root, "data");
    await fetchHome(new InfluxServer(influx, join(folder, CREDENTIALS_FILE)), filter, fetched);
    return { folder: fetched, remove };
  } catch (error) {
    remove();
    if (!(error instanceof HomeTrouble)) throw error;
    throw new Trouble(error.message, "Nothing was written.");
  }
}

/** The bench file that names the server, and the folder where its credentials may lie. */
function benchMeant(options: HomeOptions): { bench: Bench; folder: string } {
  if (options.bench !== undefined) {
    return { bench: loadBench(options.bench).bench, folder: options.data ?? "." };
  }
  const folder = options.data ?? recordFolder(options.on);
  const reader = openReader(folder);
  try {
    const parsed = parseBench(reader.lastBenchText() ?? "");
    if (parsed.ok) return { bench: parsed.bench, folder };
  } finally {
    reader.close();
  }
  throw new Trouble(
    `The record in ${folder} has no bench file that this program reads.`,
    "Name the bench file that names the server with --bench.",
    EXIT.usage,
  );
}

function sessionOf(text: string): number {
  if (/^\d{1,9}$/.test(text)) return Number(text);
  throw new Trouble(`${text} is no session's number.`, "Write it as the list has it.", EXIT.usage);
}
