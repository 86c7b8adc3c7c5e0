import type { DarkAsked, WayAnswer } from "../now/going-dark.ts";
import { clockWithSeconds } from "./format.ts";

/** What stands in the block: a word or two, and who said so. */
export interface DarkWords {
  readonly block: string;
  readonly sentence: string;
}

const NAMES = { desk: "the switch", port: "the second way" } as const;

function wayWords(name: string, way: WayAnswer): string {
  const at = clockWithSeconds(way.at);
  if (way.is === "asked") return `${name} has not answered yet`;
  if (way.is === "dark") return `${name} confirmed it at ${at}`;
  if (way.is === "refused") return `${name} refused at ${at}: ${way.words.replace(/\.$/, "")}`;
  return `${name} did not answer`;
}

/** When the first way confirmed dark; undefined while none has. */
export function confirmedAt({ desk, port }: DarkAsked): number | undefined {
  const at = [desk, port].filter((way) => way.is === "dark").map((way) => way.at);
  return at.length === 0 ? undefined : Math.min(...at);
}

/** Says who confirmed dark, and when; and what to do where nobody did. */
export function darkWords(asked: DarkAsked): DarkWords {
  const ways = [asked.desk, asked.port];
  const confirmed = ways.filter((way) => way.is === "dark");
  const first = Math.min(...confirmed.map((way) => way.at));
  const told = `${wayWords(NAMES.desk, asked.desk)}; ${wayWords(NAMES.port, asked.port)}`;
  const sentence = `Dark was asked at ${clockWithSeconds(asked.at)}: ${told}.`;
  if (confirmed.length === 2)
    return { block: `both said so, ${clockWithSeconds(first)}`, sentence };
  if (confirmed.length === 1) {
    const who = asked.desk.is === "dark" ? "switch" : "second way";
    return { block: `${who} said so, ${clockWithSeconds(first)}`, sentence };
  }
  if (ways.some((way) => way.is === "asked")) return { block: "asked both ways", sentence };
  return {
    block: "nobody confirmed",
    sentence: `${sentence} Go and look; cut the power at the bench.`,
  };
}
