import { JUDGE_VERSION } from "../judge/records.ts";
import type { Manifest } from "../model/manifest.ts";
import { Ring, ROW, ROW_LENGTH, ringBytes } from "../model/ring.ts";
import { wall } from "../model/times.ts";
import { DERIVED } from "./columns.ts";
import { FACTS, fieldOf, MONO_FIELD } from "./influx-points.ts";
import { type HomeFilter, type HomeRow, samplesOf } from "./influx-queries.ts";
import { channelNames, type HomeSession, type HomeTexts, InfluxReader } from "./influx-reader.ts";
import type { InfluxServer } from "./influx-server.ts";
import { HomeTrouble } from "./influx-trouble.ts";
import { byManifest } from "./reader.ts";
import { Recorder } from "./recorder.ts";

/** Rows handed to the recorder before it is let read them. */
const RING_ROWS = 8192;

/**
 * Fetches sessions of a bench from InfluxDB into an empty data folder, which every analysis then
 * reads like any other: samples, manifests, bench files and events. A session's number becomes
 * another one. Some of the judge's inputs are not sent there (SECOND-HOME.md names them), so such a
 * folder is not for replays. Throws a HomeTrouble, also where nothing fits the filter.
 */
export async function fetchHome(
  server: InfluxServer,
  filter: HomeFilter,
  folder: string,
  signal?: AbortSignal,
): Promise<void> {
  const reader = new InfluxReader(server, byManifest);
  const { bench } = filter;
  const sessions = (await reader.sessions(bench)).filter((s) => isWanted(s, filter));
  const texts = await reader.texts(bench);
  const [first] = texts;
  if (sessions.length === 0 || first === undefined) {
    const which = filter.session === undefined ? "" : `, session ${filter.session}`;
    const benches = await reader.benches();
    throw new HomeTrouble(
      "refused",
      `${server.part.url} has no samples of ${bench}${which} in "${server.part.database}". It has the benches: ${benches.join(", ") || "none"}.`,
    );
  }
  const fetching = new Fetching(folder, bench, first.benchText);
  try {
    for (const session of sessions) {
      fetching.begin(session, texts);
      const names = fetching.channels;
      const one = { ...filter, session: session.id };
      for await (const { fields, rows } of samplesOf(server, one, names, signal)) {
        fetching.take(fields, rows, session.run);
      }
      fetching.end(session);
    }
    const { from = 0, to = 8.64e15 } = filter;
    for (const event of await reader.events({ from: wall(from), to: wall(to) }, bench)) {
      fetching.recorder.take({ kind: "event", event });
    }
  } finally {
    fetching.recorder.close();
  }
}

function isWanted(session: HomeSession, { session: id, from, to }: HomeFilter): boolean {
  if (session.samples === 0 || (id !== undefined && session.id !== id)) return false;
  return (from === undefined || session.last >= from) && (to === undefined || session.started < to);
}

/** A recorder fed from the second home instead of from a loop. */
class Fetching {
  readonly recorder: Recorder;
  readonly #ring = new Ring(new SharedArrayBuffer(ringBytes(RING_ROWS)));
  #manifests = new Map<string, Manifest>();
  #manifest: Manifest | null = null;
  #benchText: string;

  constructor(folder: string, bench: string, benchText: string) {
    this.#benchText = benchText;
    this.recorder = new Recorder({
      ...{ folder, bench, benchText },
      judgeVersion: JUDGE_VERSION,
      ring: this.#ring.memory,
      durability: "none",
    });
  }

  /** Channels that the session's manifests have. */
  get channels(): string[] {
    return [...new Set([...this.#manifests.values()].flatMap(channelNames))];
  }

  begin(session: HomeSession, texts: readonly HomeTexts[]): void {
    const own = texts.filter((text) => text.session === session.id);
    this.#manifests = new Map(own.map(({ manifest }) => [manifest.id, manifest]));
    const ringRow = this.#ring.written;
    const benchText = own[0]?.benchText ?? this.#benchText;
    if (benchText !== this.#benchText) this.recorder.take({ kind: "bench", ringRow, benchText });
    this.#benchText = benchText;
    const at = wall(session.started);
    this.recorder.take({ kind: "session", ringRow, session: session.kind, at });
  }

  take(fields: readonly string[], rows: readonly HomeRow[], run: number): void {
    const places = fields.map((field) => placeOfField(field));
    // Civil time may have been put back: the judge's own count has the order.
    const input = fields.indexOf("host.input");
    const ordered = rows.toSorted((a, b) => Number(a.values[input]) - Number(b.values[input]));
    for (const row of ordered) this.#row(row, fields, places);
    this.recorder.drain();
    if (this.recorder.trouble !== "") {
      throw new HomeTrouble("later", `Run ${run} cannot be kept here: ${this.recorder.trouble}`);
    }
  }

  end(session: HomeSession): void {
    const ringRow = this.#ring.written;
    const at = wall(session.ended ?? session.last);
    this.recorder.take({ kind: "session", ringRow, session: "end", at });
    this.recorder.flush();
  }

  #row(row: HomeRow, fields: readonly string[], places: readonly CellPlace[]): void {
    const manifest = this.#manifests.get(row.manifest);
    if (manifest === undefined) return;
    if (manifest !== this.#manifest) {
      this.recorder.take({ kind: "manifest", ringRow: this.#ring.written, manifest });
      this.#manifest = manifest;
    }
    const { cells } = this.#ring;
    const at = this.#ring.offset(this.#ring.written);
    cells.fill(0, at, at + ROW_LENGTH);
    for (const { column, absent } of DERIVED) cells[at + column] = absent === -1 ? -1 : Number.NaN;
    cells[at + ROW.wall_ms] = row.wall_ms;
    places.forEach(({ cell, countsPerUnit }, i) => {
      const count = row.values[i];
      if (typeof count !== "number") return;
      if (cell >= 0) cells[at + cell] = count / countsPerUnit;
      else this.#channel(manifest, fields[i] ?? "", count, at);
    });
    this.#ring.publish();
  }

  #channel(manifest: Manifest, field: string, count: number, at: number): void {
    const channel = manifest.channels.find(({ name }) => fieldOf(name) === field);
    if (channel === undefined) return;
    const { cells } = this.#ring;
    cells[at + ROW.values + channel.index] = count;
    const bits = at + (channel.index < 32 ? ROW.freshLow : ROW.freshHigh);
    cells[bits] = ((cells[bits] as number) | (1 << (channel.index & 31))) >>> 0;
  }
}

/** Cell of a ring row for a field, and counts per unit there; −1 for the board's own channels. */
interface CellPlace {
  readonly cell: number;
  readonly countsPerUnit: number;
}

function placeOfField(field: string): CellPlace {
  if (field === MONO_FIELD) return { cell: ROW.mono_ms, countsPerUnit: 1000 };
  const fact = Object.entries(FACTS).find(([name]) => name === field);
  if (fact !== undefined) return { cell: fact[1], countsPerUnit: 1 };
  const made = DERIVED.find(({ name }) => fieldOf(name) === field);
  if (made === undefined) return { cell: -1, countsPerUnit: 1 };
  return { cell: made.column, countsPerUnit: 1 / made.perCount };
}
