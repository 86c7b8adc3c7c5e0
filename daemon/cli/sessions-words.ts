import { formatQuantity } from "../model/quantities.ts";
import type { SessionLine, SessionShown } from "./sessions-answers.ts";

/** Sessions as people read them. */

/** Local date and time, to the minute. */
export function moment(wall_ms: number): string {
  const at = new Date(wall_ms);
  const two = (n: number): string => String(n).padStart(2, "0");
  const day = `${at.getFullYear()}-${two(at.getMonth() + 1)}-${two(at.getDate())}`;
  return `${day} ${two(at.getHours())}:${two(at.getMinutes())}`;
}

/** A length of time to the minute, or to the second where it is short. */
export function length(ms: number): string {
  const minutes = Math.round(ms / 60_000);
  if (minutes < 2) return formatQuantity("time", Math.round(ms / 1000) * 1000, 1000);
  return minutes < 60 ? `${minutes} min` : `${Math.floor(minutes / 60)} h ${minutes % 60} min`;
}

/** One line of the list. */
export function listLine(s: SessionLine): string {
  const cells = [
    String(s.id).padStart(4),
    moment(s.started),
    (s.ended === null ? "goes on" : length(s.length_ms)).padEnd(10),
    s.kind.padEnd(7),
    rangeWords(s).padEnd(17),
    changeWords(s).padEnd(8),
    tripWords(s).padEnd(8),
    s.notes === 0 ? "" : s.notes === 1 ? "1 note" : `${s.notes} notes`,
    s.tags.join(", "),
  ];
  return cells.join("  ").trimEnd();
}

/** Titles over the columns of `listLine`. */
export const LIST_HEAD =
  "   #  began             for         kind     current            output    trips     notes, tags";

function rangeWords({ current }: SessionLine): string {
  if (current === null) return "";
  const [low, high] = [format(current.min), format(current.max)];
  if (low === high) return low;
  const [number, unit] = low.split(/\s/u);
  // The unit stands once where both have the same.
  return `${unit === high.split(/\s/u)[1] ? number : low} to ${high}`;
}

const format = (current_mA: number): string => formatQuantity("current", current_mA, 10);

/** How the output changed, in per cent of what it was. */
function changeWords({ output }: SessionLine): string {
  if (output === null || !(output.first > 0)) return "";
  const percent = (100 * (output.last - output.first)) / output.first;
  // It began in the dark or in the ramp; how many times that little is nothing to read.
  if (percent > 100) return "> +100 %";
  return `${percent > 0 ? "+" : percent < 0 ? "\u2212" : ""}${Math.abs(percent).toFixed(1)} %`;
}

const tripWords = ({ trips }: SessionLine): string =>
  trips === 0 ? "" : trips === 1 ? "1 trip" : `${trips} trips`;

/** Everything of one session, as lines. */
export function shownLines({ session, channels, gaps, events, notes }: SessionShown): string[] {
  const { id, bench, kind, samples } = session;
  const goesOn = session.ended === null ? "; it goes on" : "";
  const lines = [
    `Session ${id} of ${bench} (${kind}) began ${moment(session.started)} and has lasted ${length(session.length_ms)}${goesOn}.`,
    `${samples} samples of ${channels.length} channels; ${gaps.length === 0 ? "no gap" : gaps.length === 1 ? "1 gap" : `${gaps.length} gaps`}.`,
  ];
  if (session.current !== null) lines.push(`Current ${rangeWords(session)}.`);
  const { output } = session;
  if (output !== null) {
    const value = (x: number): string => `${Number(x.toPrecision(4))} ${output.unit}`;
    lines.push(
      `Output ${value(output.first)} at first, ${value(output.last)} at last (${changeWords(session)}).`,
    );
  }
  if (session.tags.length > 0) lines.push(`Tags: ${session.tags.join(", ")}.`);
  lines.push(`Channels: ${channels.map((c) => `${c.name}${c.unit && ` [${c.unit}]`}`).join(", ")}`);
  for (const gap of gaps) {
    lines.push(`Gap: nothing for ${length(gap.to - gap.from)} from ${moment(gap.from)}.`);
  }
  for (const event of events) lines.push(`${moment(event.at)}  ${event.words}`);
  for (const note of notes) {
    const picture =
      note.pictureType === null ? "" : ` (with a picture, ${note.pictureBytes} bytes)`;
    lines.push(`${moment(note.at)}  note ${note.id} by ${note.who}: ${note.text}${picture}`);
  }
  return lines;
}
