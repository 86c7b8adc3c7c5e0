import { MEASUREMENT, type Point, real, type SampleSource, text } from "./influx-points.ts";

/** Characters of one text field: a server takes at most 64 KiB, and a character may be three bytes. */
const PIECE_CHARS = 20_000;

/**
 * What a reader needs to understand a session's counts: the manifest and the bench file, as texts,
 * and each channel's scale as a number, for servers that keep numbers alone.
 */
export function textPoints(
  { bench, session, manifest }: SampleSource,
  benchText: string,
  timestamp: string,
): Point[] {
  const tags = { bench, session: String(session), manifest: manifest.id };
  const pieces = [
    ...piecesOf("manifest", JSON.stringify(manifest)),
    ...piecesOf("bench-file", benchText),
  ];
  return [
    { measurement: MEASUREMENT.texts, tags, fields: Object.fromEntries(pieces), timestamp },
    ...manifest.channels.map((channel) => ({
      measurement: MEASUREMENT.channels,
      tags: { bench, manifest: manifest.id, channel: channel.name, unit: channel.unit },
      fields: { per_count: real(channel.perCount) },
      timestamp,
    })),
  ];
}

/** A text as numbered fields; carried as JSON, so that no line end stands in a line. */
function piecesOf(name: string, whole: string): [string, Point["fields"][string]][] {
  const json = JSON.stringify(whole);
  const pieces: [string, Point["fields"][string]][] = [];
  for (let at = 0; at < json.length; at += PIECE_CHARS) {
    pieces.push([`${name}.${pieces.length}`, text(json.slice(at, at + PIECE_CHARS))]);
  }
  return pieces;
}

/** The text that `piecesOf` took apart; null where a piece is missing. */
export function joined(name: string, fields: ReadonlyMap<string, unknown>): string | null {
  let json = "";
  for (let i = 0; ; i++) {
    const piece = fields.get(`${name}.${i}`);
    if (typeof piece !== "string") break;
    json += piece;
  }
  try {
    return json === "" ? null : (JSON.parse(json) as string);
  } catch {
    // A piece is missing: half a text is no text.
    return null;
  }
}
