import type { Row } from "../now/track.ts";
import { amps, clockWithSeconds, degrees, power } from "./format.ts";

const BY = [
  "derating",
  "the junction limit",
  "the bench limit",
  "the limit asked for",
  "the plan's limit",
  "a hazard",
  "the limit while unattended",
  "the board's own limit",
];

/** What the cursor reads, as a sentence: the picture in words, at one moment. */
export function cursorSentence(row: Row): string {
  const time = clockWithSeconds(row.t);
  if (Number.isNaN(row.current) && Number.isNaN(row.degC)) return `${time}: nothing is known.`;
  const by = BY[row.maker];
  const maker = by === undefined ? "" : ` by ${by}`;
  const corridor = `${amps(row.current)}, ceiling ${amps(row.ceiling)}${maker}, threshold ${amps(row.floor)}`;
  return `${time}: ${corridor}; ${power(row.output)}; case ${degrees(row.degC)}.`;
}
