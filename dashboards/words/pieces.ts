import { keepUnits } from "./format.ts";

/** One run of a sentence: plain, or a word that carries a specimen, or what is abnormal. */
export interface Piece {
  readonly text: string;
  readonly kind: "plain" | "ceiling" | "floor" | "current" | "warn" | "trip";
}

/** What the sentence is about, so that the right words in it are marked. */
export interface About {
  /** The present current as it is written in the sentence, "1.64 A". */
  readonly current: string;
  /** Why light was cut, where it was; that part of the sentence is the message. */
  readonly cause: string;
}

const escaped = (text: string): string => text.replace(/[.*+?^${}()|[\]\\]/g, "\\$&");

/**
 * Cuts a sentence into pieces: "ceiling", "threshold" or "floor" and the present current carry a
 * specimen the first time they are named; "held down from …" and the cause of a trip are coloured.
 * Joined together the pieces are the sentence again.
 */
export function pieces(sentence: string, about: About): Piece[] {
  const text = keepUnits(sentence);
  const parts = ["(?<ceiling>ceiling)", "(?<floor>threshold|floor)"];
  const held = "(?<warn>held down from \\d+(?:\\.\\d+)?\u00a0m?A)";
  const current = about.current === "" ? [] : [`(?<current>(?<![\\d.])${escaped(about.current)})`];
  const cause = keepUnits(about.cause);
  const because = cause === "" ? [] : [`(?<trip>${escaped(cause)})`];
  const pattern = new RegExp([...because, held, ...current, ...parts].join("|"), "gi");

  const out: Piece[] = [];
  const seen = new Set<string>();
  let at = 0;
  const plain = (to: number): void => {
    if (to > at) out.push({ text: text.slice(at, to), kind: "plain" });
  };
  for (const match of text.matchAll(pattern)) {
    const kind = Object.entries(match.groups ?? {}).find(([, v]) => v !== undefined)?.[0];
    if (kind === undefined || seen.has(kind)) continue;
    seen.add(kind);
    plain(match.index);
    out.push({ text: match[0], kind: kind as Piece["kind"] });
    at = match.index + match[0].length;
  }
  plain(text.length);
  return out;
}
