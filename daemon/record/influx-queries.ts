import { FACTS, fieldOf, MEASUREMENT, MONO_FIELD } from "./influx-points.ts";
import type { AnsweredSeries, InfluxServer } from "./influx-server.ts";
import { stampText } from "./influx-stamps.ts";

/** Samples asked for in one question: about 2 MB of answer. */
const ROWS_A_QUESTION = 6000;

const NANOS_A_MILLI = 1_000_000;

/** A name in InfluxQL. */
export const quoted = (name: string): string =>
  `"${name.replaceAll("\\", "\\\\").replaceAll('"', '\\"')}"`;
/** A text in InfluxQL. */
export const literal = (value: string): string =>
  `'${value.replaceAll("\\", "\\\\").replaceAll("'", "\\'")}'`;

/** Civil time as InfluxQL compares it, nanoseconds. */
export function stampOf(wall_ms: number): string {
  const ms = Math.floor(wall_ms);
  return ms < 0 ? "0" : stampText(ms, Math.floor((wall_ms - ms) * NANOS_A_MILLI));
}

/** Where a measurement is kept. */
export const measured = ({ policy }: InfluxServer, name: string): string =>
  policy === undefined ? quoted(name) : `${quoted(policy)}.${quoted(name)}`;

/** Which samples are wanted; a bound left out does not bind. */
export interface HomeFilter {
  readonly bench: string;
  readonly session?: number;
  /** Civil time, milliseconds since 1970; `to` is not included. */
  readonly from?: number;
  readonly to?: number;
}

/** A filter as the condition of a question. */
export function condition({ bench, session, from, to }: HomeFilter): string {
  const parts = [`"bench" = ${literal(bench)}`];
  if (session !== undefined) parts.push(`"session" = ${literal(String(session))}`);
  if (from !== undefined) parts.push(`time >= ${stampOf(from)}`);
  if (to !== undefined) parts.push(`time < ${stampOf(to)}`);
  return parts.join(" AND ");
}

/** A time as the server writes it, to the nanosecond, as milliseconds since 1970. */
export function wallOf(time: string): number {
  const second_ms = Date.parse(`${time.slice(0, 19)}Z`);
  const fraction = time.slice(20, -1);
  return fraction === "" ? second_ms : second_ms + Number(fraction.padEnd(9, "0")) / NANOS_A_MILLI;
}

/** One sample as the server has it: counts by field, null where it has none. */
export interface HomeRow {
  readonly wall_ms: number;
  readonly session: number;
  readonly manifest: string;
  readonly values: readonly (number | string | null)[];
}

/** Samples in order of time, some at once; `fields` says what stands where in `values`. */
export interface HomeRows {
  readonly fields: readonly string[];
  readonly rows: readonly HomeRow[];
}

const TAGS = ["session", "manifest"];

/** Every sample of a filter, with the facts and these channels, in bounded memory. */
export async function* samplesOf(
  server: InfluxServer,
  filter: HomeFilter,
  channels: readonly string[],
  signal?: AbortSignal,
): AsyncGenerator<HomeRows> {
  const fields = [...Object.keys(FACTS), MONO_FIELD, ...channels.map(fieldOf)];
  const selected = [...fields, ...TAGS].map(quoted).join(", ");
  const from = measured(server, MEASUREMENT.samples);
  // From the first question on, a place is a stamp of the server's own, so nothing is rounded.
  let after = "";
  for (;;) {
    const question = `SELECT ${selected} FROM ${from} WHERE ${condition(filter)}${after} LIMIT ${ROWS_A_QUESTION}`;
    const values = await rowsOf(server, question, signal);
    const isLast = values.length < ROWS_A_QUESTION;
    const whole = isLast ? values : withoutLastTime(values);
    yield { fields, rows: whole.map((row) => rowOf(row, fields.length)) };
    if (isLast) return;
    const next = values.at(-1)?.[0];
    after =
      whole.length < values.length
        ? ` AND time >= '${String(next)}'`
        : ` AND time > '${String(next)}'`;
  }
}

type Values = AnsweredSeries["values"][number];

async function rowsOf(
  server: InfluxServer,
  question: string,
  signal: AbortSignal | undefined,
): Promise<readonly Values[]> {
  const series = await server.query(question, "iso", signal);
  return series[0]?.values ?? [];
}

/** Samples of one stamp may be cut by the limit: all of that stamp come with the next question. */
function withoutLastTime(values: readonly Values[]): readonly Values[] {
  const last = values.at(-1)?.[0];
  let end = values.length;
  while (end > 0 && values[end - 1]?.[0] === last) end--;
  return end === 0 ? values : values.slice(0, end);
}

const rowOf = (row: Values, fields: number): HomeRow => ({
  wall_ms: wallOf(String(row[0])),
  session: Number(row[1 + fields]),
  manifest: String(row[2 + fields]),
  values: row.slice(1, 1 + fields),
});
