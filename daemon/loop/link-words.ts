import type { EventLine } from "../control/api.ts";
import type { LinkFact } from "../model/link-fact.ts";
import type { Loop } from "./loop.ts";

/** What the link found, in sentences for people. */
export interface ToldFact {
  readonly words: string;
  readonly weight: EventLine["weight"];
}

/** Broken lines before an introduction from which on they are told: the first ones may be torn. */
const BROKEN_TOLD = 5;

/** A link fact that is a person's business; null for the others. */
export function toldFact(fact: LinkFact, value: number, text: string): ToldFact | null {
  const words = factWords(fact, value, text);
  return words === "" ? null : { words, weight: fact === "curve-loaded" ? "calm" : "warn" };
}

function factWords(fact: LinkFact, value: number, text: string): string {
  switch (fact) {
    case "wrong-version":
      return text.charAt(0).toUpperCase() + text.slice(1);
    case "not-introduced":
      return `What the board tells of itself cannot be used: ${text}. Flash the firmware that belongs to this program.`;
    case "board-reset":
      return `The board started anew (${text}).`;
    case "board-changed":
      return `Another board: ${text}.`;
    case "curve-loaded":
      return `The board has its ceiling curve: ${text}.`;
    case "curve-failed":
      return `The board did not take its ceiling curve: ${text}.`;
    case "reset-refused":
      return `The board refused the reset: ${text}.`;
    case "arm-refused":
      return `Arming was refused: ${text}.`;
    case "no-answer":
      return noAnswerWords(value, text);
    default:
      return "";
  }
}

function noAnswerWords(tries: number, verb: string): string {
  if (verb === "who") {
    return `Whatever is on this port does not say who it is, asked ${tries} times. Look whether it is the right port, at its baud rate, and whether the board has its firmware.`;
  }
  if (verb === "stream") {
    return "Lines come, or none do, but none fits the stream of the bench file. Run beamsitter listen PORT --guess, and compare.";
  }
  if (verb === "dark") {
    return `The board has not confirmed dark after ${tries} orders. Go and look.`;
  }
  return `The board did not answer "${verb}".`;
}

/** Whether this fact means that the board cannot be used until somebody does something. */
export function standsInTheWay(fact: LinkFact, text: string): boolean {
  if (fact === "no-answer") return text === "who" || text === "stream";
  return fact === "wrong-version" || fact === "not-introduced" || fact === "curve-failed";
}

/** What is left of a standing trouble after a fact that is none itself. */
export function keepsTrouble(fact: LinkFact, trouble: string): string {
  const ended = fact === "introduced" || fact === "curve-loaded" || fact === "port-open";
  return ended ? "" : trouble;
}

/**
 * What stands between the daemon and its board just now, worst first; empty where nothing does.
 * @param outside what the port says; empty while lines come
 */
export function linkWords(loop: Loop, outside: string): string {
  if (outside !== "") return outside;
  if (loop.problems.length > 0) return loop.problems.join(" ");
  const { phase } = loop.session;
  const unread = loop.brokenSinceOpen;
  if ((phase === "asking" || phase === "stopped") && unread >= BROKEN_TOLD) {
    return `Lines come, but ${unread} of them could not be read. Look at the baud rate in the bench file, and whether this port is the board's.`;
  }
  return loop.telling.trouble;
}
