import type { TransportSpec } from "../../model/bench.ts";
import type { Guess, GuessedColumn } from "./guess.ts";
import { SURE } from "./guess-column.ts";

/**
 * The guess as the piece of a bench file that it stands for: its section `controller`. What is not
 * sure stands there as recorded and not judged, with the reason behind it.
 */
export function pieceOf(
  guess: Guess,
  transport: Exclude<TransportSpec, { kind: "built-in" }>,
): string {
  const connect =
    transport.kind === "serial"
      ? `{ kind: serial, path: ${transport.path}, baud: ${transport.baud} baud }`
      : `{ kind: tcp, host: ${transport.host}, port: ${transport.port} }`;
  const lines = [
    "controller:",
    `  connect: ${connect}`,
    `  rate: ${guess.rate_perS} /s`,
    "  stream:",
  ];
  lines.push(`    format: ${guess.format ?? "csv"}`);
  if (guess.format === "csv") lines.push(`    separator: ${guess.separator}`);
  if (guess.decimals === "comma") lines.push("    decimals: comma");
  if (guess.time !== null) {
    lines.push(`    time: ${quoted(guess.time.from)}`, `    time-unit: ${guess.time.unit}`);
  }
  lines.push("    columns:", ...guess.columns.map(columnLine));
  return `${lines.join("\n")}\n`;
}

function columnLine(column: GuessedColumn): string {
  const { channel, from, unit, scale, offset, step, confidence, doubt } = column;
  const parts = [`from: ${quoted(from)}`];
  if (confidence < SURE) parts.push("unit: counts", `step: ${short(step)}`);
  else {
    parts.push(`unit: ${quoted(unit)}`);
    if (scale !== 1) parts.push(`scale: ${short(scale)}`);
    if (offset !== 0) parts.push(`offset: ${short(offset)}`);
  }
  const note = doubt === "" ? "" : `  # ${doubt}`;
  return `      ${channel}: { ${parts.join(", ")} }${note}`;
}

/** Numbers as the bench file reads them: seven digits are more than any board prints. */
const short = (value: number): string => String(Number(value.toPrecision(7)));

const quoted = (text: string): string =>
  /^[A-Za-z0-9°][A-Za-z0-9_.°]*$/.test(text) ? text : JSON.stringify(text);
