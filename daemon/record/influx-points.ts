import { escape as escaped } from "influx";
import type { Manifest } from "../model/manifest.ts";
import { ROW } from "../model/ring.ts";
import type { Block } from "./blocks.ts";
import { NOT_KNOWN, placesOf } from "./columns.ts";
import type { Stamps } from "./influx-stamps.ts";
import { countsFor } from "./rollup.ts";

/** Measurements of the second home; SECOND-HOME.md describes them. */
export const MEASUREMENT = {
  samples: "beamsitter_samples",
  channels: "beamsitter_channels",
  events: "beamsitter_events",
  sessions: "beamsitter_sessions",
  gaps: "beamsitter_gaps",
  notes: "beamsitter_notes",
  epochs: "beamsitter_epochs",
  readings: "beamsitter_readings",
  texts: "beamsitter_texts",
} as const;

/**
 * A field as the line protocol writes it. The package writes what it does not know as it reads as a
 * text, so whole numbers keep their `i` and quoted texts are quoted here, once, for every way out.
 */
export interface Field {
  toString(): string;
}

/** One point. Two with the same measurement, tags and stamp are one: the later takes its place. */
export interface Point {
  readonly measurement: string;
  readonly tags: Readonly<Record<string, string>>;
  readonly fields: Readonly<Record<string, Field>>;
  /** Whole number of nanoseconds or, for a server that keeps no finer ones, milliseconds. */
  readonly timestamp: string;
}

class Written implements Field {
  readonly #text: string;
  constructor(text: string) {
    this.#text = text;
  }
  toString(): string {
    return this.#text;
  }
}

/** A whole number, kept as one. */
export const whole = (value: number): Field => new Written(`${value}i`);
/** Any finite number. */
export const real = (value: number): Field => new Written(String(value));
/** A text; line ends and quotes are carried as JSON does, for servers that read line by line. */
export const text = (value: string): Field =>
  new Written(`"${value.replaceAll("\\", "\\\\").replaceAll('"', '\\"')}"`);

/** A point as a line of the protocol, without its end. */
export function lineOf({ measurement, tags, fields, timestamp }: Point): string {
  const head = Object.entries(tags).map(([k, v]) => `,${escaped.tag(k)}=${escaped.tag(v)}`);
  const body = Object.keys(fields)
    .sort()
    .map((name) => `${escaped.tag(name)}=${String(fields[name])}`);
  return `${escaped.measurement(measurement)}${head.join("")} ${body.join(",")} ${timestamp}`;
}

/** Facts of a sample beside its channels, by field. */
export const FACTS = {
  "board.seq": ROW.seq,
  "board.tick": ROW.tick,
  "board.status": ROW.status,
  "board.cause": ROW.cause,
  "host.input": ROW.input,
} as const;
/** Monotonic time of receipt, whole microseconds. */
export const MONO_FIELD = "host.mono_us";

/** Names that the server keeps for itself, or that are tags here. */
const TAKEN = new Set(["time", "bench", "session", "manifest", "clock"]);

/** Field of a channel: its own name, unless that is taken. */
export const fieldOf = (channel: string): string =>
  TAKEN.has(channel) ? `channel.${channel}` : channel;

/** What all samples of one chunk have in common. */
export interface SampleSource {
  readonly bench: string;
  readonly session: number;
  readonly manifest: Manifest;
  readonly block: Block;
}

/** Points of a chunk, and what could not become one. */
export interface SamplePoints {
  readonly points: Point[];
  /** Values left out because they are no whole numbers, which a field of counts cannot hold. */
  readonly broken: number;
  /** Input of the last of them, and whether the chunk has no later ones. */
  readonly input: number;
  readonly isWhole: boolean;
}

/**
 * The first samples of a chunk whose input is later than `after`, as points, in order. Values are counts as
 * the controller sent them; a channel that a sample did not bring has no field there.
 */
export function samplePoints(
  source: SampleSource,
  after: number,
  stamps: Stamps,
  points_max: number,
): SamplePoints {
  const { block, manifest, bench, session } = source;
  const column = (id: number): Float64Array => block.column(id) ?? new Float64Array(block.n);
  const walls = column(ROW.wall_ms);
  const monos = column(ROW.mono_ms);
  const inputs = column(ROW.input);
  const low = column(ROW.freshLow);
  const high = column(ROW.freshHigh);
  const facts = Object.entries(FACTS).map(([field, id]) => ({ field, values: column(id) }));
  const channels = placesOf(manifest).flatMap((place) => {
    const values = block.column(place.column);
    return values === null ? [] : [{ place, field: fieldOf(place.channel.name), values }];
  });
  const points: Point[] = [];
  let broken = 0;
  let input = after;
  for (let i = 0; i < block.n; i++) {
    if ((inputs[i] as number) <= after) continue;
    if (points.length >= points_max) return { points, broken, input, isWhole: false };
    input = inputs[i] as number;
    const fields: Record<string, Field> = {};
    for (const { field, values } of facts) fields[field] = whole(values[i] as number);
    fields[MONO_FIELD] = whole(Math.round((monos[i] as number) * 1000));
    for (const { place, field, values } of channels) {
      if (!countsFor(place, values, low, high, i)) continue;
      const value = values[i] as number;
      if (Number.isSafeInteger(value) && value !== NOT_KNOWN) fields[field] = whole(value);
      else broken++;
    }
    const { stamp, clock } = stamps.next(walls[i] as number, session);
    const tags = { bench, session: String(session), manifest: manifest.id };
    points.push({
      measurement: MEASUREMENT.samples,
      tags: clock === 0 ? tags : { ...tags, clock: String(clock) },
      fields,
      timestamp: stamp,
    });
  }
  return { points, broken, input, isWhole: true };
}
