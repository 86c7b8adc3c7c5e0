import type { BenchEvent } from "../model/event.ts";
import type { Manifest } from "../model/manifest.ts";
import type { SessionKind } from "../model/record-messages.ts";
import type { SeriesAnswer, SeriesQuery, SeriesStore } from "../model/series.ts";
import { mono, wall } from "../model/times.ts";
import { placeOf, placesOf } from "./columns.ts";
import { gapsWithin } from "./gaps.ts";
import { fieldOf, MEASUREMENT } from "./influx-points.ts";
import {
  condition,
  type HomeFilter,
  literal,
  measured,
  quoted,
  samplesOf,
  wallOf,
} from "./influx-queries.ts";
import type { AnsweredSeries, InfluxServer } from "./influx-server.ts";
import { joined } from "./influx-texts.ts";
import { HomeTrouble } from "./influx-trouble.ts";
import type { Converter, TimeWindow } from "./reader.ts";
import { addStats, type Gatherer, levelFor, SINGLES_A_PIXEL, Singles, Steps } from "./series.ts";

/** A session as the second home knows it. */
export interface HomeSession {
  readonly id: number;
  readonly run: number;
  readonly kind: SessionKind;
  readonly started: number;
  readonly last: number;
  /** Null while it goes on, or where its end has not been sent. */
  readonly ended: number | null;
  readonly samples: number;
}

/** What is needed to read a session's counts. */
export interface HomeTexts {
  readonly session: number;
  readonly manifest: Manifest;
  readonly benchText: string;
}

/**
 * The record as InfluxDB has it, through the same questions and with the same answers as the data
 * folder. It makes nothing and changes nothing. Every question may throw a HomeTrouble.
 */
export class InfluxReader implements SeriesStore {
  readonly #server: InfluxServer;
  readonly #convert: Converter;

  /** Throws a HomeTrouble for a server that keeps numbers alone: it takes the record, but is read by its own tools. */
  constructor(server: InfluxServer, convert: Converter) {
    if (server.part.server !== "influxdb") {
      throw new HomeTrouble(
        "refused",
        `${server.part.url} is a VictoriaMetrics: it keeps numbers, no texts. Read it with its own tools, or the record from its folder.`,
      );
    }
    this.#server = server;
    this.#convert = convert;
  }

  /**
   * The same picture as of the data folder. Where a pixel is a second or more, the server makes the
   * statistics; a mean of counts is converted, as there.
   */
  async series(query: SeriesQuery, signal?: AbortSignal): Promise<SeriesAnswer> {
    const picture = pictureOf(query);
    const { bench, channels, window } = query;
    const manifests = await this.#manifests(bench);
    const filter = { bench, ...(picture.steps > 0 ? picture.reach : window) };
    const isSingle =
      picture.level_ms === 0 &&
      (await this.#count(filter)) <= SINGLES_A_PIXEL * Math.max(1, query.pixels);
    const gatherers = new Map<string, Gatherer>(
      channels.map((name) => [
        name,
        isSingle
          ? new Singles(window.from, window.to)
          : new Steps(picture.first, picture.steps, picture.step_ms),
      ]),
    );
    if (picture.level_ms > 0) {
      await this.#gatherStats(filter, picture.step_ms, manifests, gatherers, signal);
    } else await this.#gatherSamples(filter, manifests, gatherers, signal);
    signal?.throwIfAborted();
    return {
      channels: Object.fromEntries([...gatherers].map(([name, g]) => [name, g.trace()])),
      gaps: await this.#gaps(bench, window),
      step_ms: isSingle ? 0 : picture.step_ms,
    };
  }

  /** Events of a window (to not included), in order of their ids. */
  async events(window: TimeWindow, bench?: string): Promise<BenchEvent[]> {
    const where = [`time >= ${Math.floor(window.from)}ms`, `time < ${Math.ceil(window.to)}ms`];
    if (bench !== undefined) where.push(`"bench" = ${literal(bench)}`);
    const rows = await this.#rows(
      `SELECT * FROM ${this.#from("events")} WHERE ${where.join(" AND ")}`,
    );
    return rows
      .map(eventFrom)
      .filter((event) => event.wall >= window.from && event.wall < window.to)
      .sort((a, b) => a.id - b.id);
  }

  /** Sessions of a bench, oldest first. */
  async sessions(bench: string): Promise<HomeSession[]> {
    const rows = await this.#rows(
      `SELECT * FROM ${this.#from("sessions")} WHERE "bench" = ${literal(bench)}`,
    );
    return rows.map((row) => ({
      id: Number(row.get("session")),
      run: Number(row.get("run")),
      kind: String(row.get("kind")) as SessionKind,
      started: Number(row.get("started_ms")),
      last: Number(row.get("last_ms")),
      ended: (row.get("ended_ms") as number | null | undefined) ?? null,
      samples: Number(row.get("samples")),
    }));
  }

  /** Benches that the database knows. */
  async benches(): Promise<string[]> {
    const found = await this.#server.query(
      `SHOW TAG VALUES FROM ${this.#from("sessions")} WITH KEY = "bench"`,
      "ms",
    );
    return found.flatMap((series) => series.values.map((row) => String(row[1])));
  }

  /** Manifest and bench file of a bench's sessions, oldest first. */
  async texts(bench: string): Promise<HomeTexts[]> {
    const rows = await this.#rows(
      `SELECT * FROM ${this.#from("texts")} WHERE "bench" = ${literal(bench)}`,
    );
    return rows.flatMap((row) => {
      const manifest = joined("manifest", row);
      const benchText = joined("bench-file", row);
      if (manifest === null || benchText === null) return [];
      const session = Number(row.get("session"));
      return [{ session, manifest: JSON.parse(manifest) as Manifest, benchText }];
    });
  }

  async #manifests(bench: string): Promise<Map<string, Manifest>> {
    const texts = await this.texts(bench);
    return new Map(texts.map(({ manifest }) => [manifest.id, manifest]));
  }

  async #count(filter: HomeFilter): Promise<number> {
    const rows = await this.#rows(
      `SELECT count("host.input") AS n FROM ${this.#from("samples")} WHERE ${condition(filter)}`,
    );
    return Number(rows[0]?.get("n") ?? 0);
  }

  async #gatherStats(
    filter: HomeFilter,
    step_ms: number,
    manifests: ReadonlyMap<string, Manifest>,
    gatherers: ReadonlyMap<string, Gatherer>,
    signal: AbortSignal | undefined,
  ): Promise<void> {
    for (const [name, gatherer] of gatherers) {
      const field = quoted(fieldOf(name));
      const series = await this.#server.query(
        `SELECT count(${field}), min(${field}), mean(${field}), max(${field})
         FROM ${this.#from("samples")} WHERE ${condition(filter)}
         GROUP BY time(${step_ms}ms), "manifest" fill(none)`,
        "ms",
        signal,
      );
      for (const { tags, values } of series) {
        const manifest = manifests.get(tags?.manifest ?? "");
        const place = manifest === undefined ? null : placeOf(manifest, name);
        if (place === null) continue;
        for (const row of values) {
          const [t, n, min, mean, max] = row.map(Number) as [
            number,
            number,
            number,
            number,
            number,
          ];
          if (n > 0) addStats(gatherer, place, this.#convert, t, min, mean, max, n);
        }
      }
    }
  }

  async #gatherSamples(
    filter: HomeFilter,
    manifests: ReadonlyMap<string, Manifest>,
    gatherers: ReadonlyMap<string, Gatherer>,
    signal: AbortSignal | undefined,
  ): Promise<void> {
    const names = [...gatherers.keys()];
    for await (const { fields, rows } of samplesOf(this.#server, filter, names, signal)) {
      const facts = fields.length - names.length;
      for (const { wall_ms, manifest: id, values } of rows) {
        const manifest = manifests.get(id);
        if (manifest === undefined) continue;
        names.forEach((name, i) => {
          const count = values[facts + i];
          const place = placeOf(manifest, name);
          if (typeof count !== "number" || place === null) return;
          const value = this.#convert(place.channel, count);
          gatherers.get(name)?.add(wall_ms, value, value, value, 1);
        });
      }
    }
  }

  async #gaps(bench: string, { from, to }: TimeWindow): Promise<SeriesAnswer["gaps"]> {
    if (!(to > from)) return [];
    const rows = await this.#rows(
      `SELECT * FROM ${this.#from("gaps")} WHERE "bench" = ${literal(bench)} AND "to_ms" > ${from}
       AND time < ${Math.ceil(to)}ms`,
    );
    const gaps = rows.map((row) => ({
      a: Number(row.get("wall_ms")),
      b: Number(row.get("to_ms")),
    }));
    const sessions = (await this.sessions(bench)).filter((session) => session.samples > 0);
    const [first] = await this.#server.query(
      `SELECT first("host.input") FROM ${this.#from("samples")} WHERE "bench" = ${literal(bench)}`,
      "iso",
    );
    return gapsWithin(
      {
        gaps: gaps.filter((gap) => gap.a < to),
        first: first === undefined ? null : wallOf(String(first.values[0]?.[0])),
        last: sessions.length === 0 ? null : Math.max(...sessions.map((session) => session.last)),
      },
      from,
      to,
    );
  }

  #from(name: keyof typeof MEASUREMENT): string {
    return measured(this.#server, MEASUREMENT[name]);
  }

  async #rows(question: string): Promise<Map<string, unknown>[]> {
    return (await this.#server.query(question, "ms")).flatMap(rowsByName);
  }
}

/** How a question is cut into steps: as for the data folder. */
function pictureOf({ window, pixels }: SeriesQuery) {
  const { from, to } = window;
  const pixel_ms = Math.max(0, to - from) / Math.max(1, Math.floor(pixels));
  const level_ms = levelFor(pixel_ms);
  const step_ms = level_ms > 0 ? Math.ceil(pixel_ms / level_ms) * level_ms : pixel_ms;
  const first = Math.floor(from / step_ms);
  const steps = step_ms > 0 ? Math.max(0, Math.ceil(to / step_ms) - first) : 0;
  return {
    level_ms,
    step_ms,
    first,
    steps,
    reach: { from: first * step_ms, to: (first + steps) * step_ms },
  };
}

const rowsByName = ({ columns, values }: AnsweredSeries): Map<string, unknown>[] =>
  values.map((row) => new Map(columns.map((name, i) => [name, row[i]])));

const eventFrom = (row: ReadonlyMap<string, unknown>): BenchEvent => ({
  id: Number(row.get("id")),
  bench: String(row.get("bench")),
  input: Number(row.get("input")),
  tick: Number(row.get("tick")),
  mono: mono(Number(row.get("mono_ms"))),
  wall: wall(Number(row.get("wall_ms"))),
  kind: String(row.get("kind")) as BenchEvent["kind"],
  hazard: String(row.get("hazard")),
  // JSON has no NaN: a number that was not known was written as null.
  data: JSON.parse(String(row.get("data")), (_key, value) =>
    value === null ? Number.NaN : value,
  ) as BenchEvent["data"],
});

/** Names of all that a manifest's samples may bring. */
export const channelNames = (manifest: Manifest): string[] =>
  placesOf(manifest).map((place) => place.channel.name);
