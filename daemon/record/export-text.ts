import type { ExportColumn, ExportRow } from "./export-rows.ts";

/** Rows as text: CSV of steps, JSON lines, and the line protocol of InfluxDB. Pure. */

const LINE_END = "\r\n";

/** A CSV header (RFC 4180): units in brackets behind the names, or on a line of their own. */
export function csvHead(
  columns: readonly ExportColumn[],
  units: "brackets" | "second-line",
): string {
  const all = [{ name: "time", unit: "UTC" }, { name: "session", unit: "" }, ...columns];
  if (units === "second-line") {
    return csvLine(all.map((c) => c.name)) + csvLine(all.map((c) => c.unit));
  }
  return csvLine(all.map((c) => (c.unit === "" ? c.name : `${c.name} [${c.unit}]`)));
}

/** One row of CSV; a cell is empty where there is no value. */
export const csvRow = (row: ExportRow): string =>
  csvLine([
    new Date(row.wall_ms).toISOString(),
    String(row.session),
    ...row.cells.map((cell) => (cell === null ? "" : String(cell))),
  ]);

/** A cell with a comma, quote or line end is quoted, quotes doubled. */
const csvLine = (cells: readonly string[]): string =>
  cells.map((c) => (/[",\r\n]/.test(c) ? `"${c.replaceAll('"', '""')}"` : c)).join(",") + LINE_END;

/** One row as a JSON object on a line of its own; channels without a value are left out. */
export function jsonRow(columns: readonly ExportColumn[], row: ExportRow): string {
  const time = new Date(row.wall_ms).toISOString();
  const made: Record<string, unknown> = { time, bench: row.bench, session: row.session };
  columns.forEach(({ name }, i) => {
    const cell = row.cells[i] ?? null;
    if (cell !== null) made[name] = cell;
  });
  return `${JSON.stringify(made)}\n`;
}

/** Measurement of exported rows: values in units, unlike those that a second home is given. */
const MEASUREMENT = "beamsitter_export";

/** One row of the line protocol, stamped in nanoseconds; empty where no channel has a value. */
export function influxRow(columns: readonly ExportColumn[], row: ExportRow): string {
  const fields = columns.flatMap(({ name }, i) => {
    const cell = row.cells[i] ?? null;
    if (cell === null) return [];
    return [`${keyText(name)}=${typeof cell === "number" ? cell : valueText(cell)}`];
  });
  if (fields.length === 0) return "";
  const tags = `bench=${keyText(row.bench)},session=${row.session}`;
  return `${MEASUREMENT},${tags} ${fields.join(",")} ${nanoseconds(row.wall_ms)}\n`;
}

const keyText = (text: string): string => text.replace(/[,= ]/g, "\\$&").replace(/[\r\n]/g, " ");
const valueText = (text: string): string => `"${text.replace(/["\\]/g, "\\$&")}"`;

/** A number cannot hold nanoseconds since 1970 exactly; whole microseconds it can. */
const nanoseconds = (wall_ms: number): string => `${Math.round(wall_ms * 1000)}000`;
