import { PlainSession } from "../link/plain/session.ts";
import { type CurvePoints, LinkSession } from "../link/session.ts";
import type { Bench } from "../model/bench.ts";
import type { Manifest } from "../model/manifest.ts";

/** A link to a controller, whichever language it speaks. */
export type Session = LinkSession | PlainSession;

/** Level of dark current below which a cut counts as confirmed, where the file has none, mA. */
const DARK_mA = 5;

/** The session that a bench's controller needs: line protocol, or a stream that is watched. */
export function sessionFor(
  bench: Bench,
  serial: string | null,
  curve: (manifest: Manifest) => CurvePoints | null,
): Session {
  const { stream, rate_perS } = bench.controller;
  if (stream === undefined) return new LinkSession({ serial, curve });
  const column = stream.columns.find(({ channel }) => channel === "current");
  const law = bench.conversions.current?.law;
  const offset_mA = law?.kind === "linear" ? law.offset : 0;
  const perCount = law?.kind === "linear" ? law.perCount : (column?.perCount ?? 1);
  const dark_mA = bench.hazards["dark-current"].warn ?? DARK_mA;
  return new PlainSession({
    stream,
    rate_perS,
    dark_counts: (dark_mA - offset_mA) / perCount,
  });
}
