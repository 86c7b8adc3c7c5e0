import type { Snapshot } from "../../daemon/desk/api.ts";
import { age, amps, clockWithSeconds } from "./format.ts";

/** The sentences over the picture, with what the page itself knows: how old they are. */
export interface Sentences {
  readonly state: string;
  readonly next: string;
  /** Part of the state sentence that is the message, where it is the page's own. */
  readonly abnormal: string;
}

/** What the page knows beside the snapshot. */
export interface Beside {
  readonly silence_ms: number;
  readonly signedOut: boolean;
  /** When a dark asked from this page was confirmed, ms since 1970. */
  readonly dark_at: number | undefined;
}

/** The daemon's own sentences, or the page's where nothing was heard of late. */
export function sentencesOf(now: Snapshot, beside: Beside): Sentences {
  if (beside.signedOut) {
    const abnormal = "This page is not signed in any more.";
    return {
      abnormal,
      state: `${abnormal} It last heard from ${now.bench} at ${clockWithSeconds(now.at)}.`,
      next: "Next: run beamsitter open on the bench's computer. Dark still goes the second way from here.",
    };
  }
  if (beside.silence_ms > 0) return silentSentences(now, beside);
  return { abnormal: "", state: withCorridor(now), next: now.next };
}

/** A snapshot may have left while dark was already asked; the confirmation is the newer word. */
const CONFIRMED_ms = 1000;

const WAYS = " Dark goes by two ways at once; go and look if neither answers.";

function silentSentences(now: Snapshot, { silence_ms, dark_at }: Beside): Sentences {
  const abnormal = `Nothing heard from ${now.bench} for ${age(silence_ms)}.`;
  const lit = now.state === "armed" || now.state === "emitting";
  const said = lit
    ? amps(now.current_mA)
    : `that it is ${now.state === "tripped" ? "dark and tripped" : "dark"}`;
  const last = `It last said ${said}, at ${clockWithSeconds(now.at)}.`;
  const confirmed = dark_at !== undefined && dark_at >= now.at - CONFIRMED_ms;
  const whether = confirmed
    ? ` Dark was confirmed at ${clockWithSeconds(dark_at)}.`
    : lit && now.enforcement === "permit"
      ? ` Its permits end ${(now.link.term_ms / 1000).toFixed(1)}\u00a0s after the computer falls silent; whether it is dark is not known here.`
      : "";
  return {
    abnormal,
    state: `${abnormal} ${last}${whether}`,
    next: `Next: this page asks again every 2\u00a0s.${confirmed ? "" : WAYS}`,
  };
}

/** Where the corridor stands, where the daemon's sentence does not say so by itself. */
function withCorridor(now: Snapshot): string {
  const { sentence } = now;
  if (now.state !== "emitting" || /ceiling/i.test(sentence)) return sentence;
  if (now.headroom_mA === null || now.margin_mA === null) return sentence;
  const below =
    now.margin_mA < 0 ? `${amps(-now.margin_mA)} above it` : `${amps(now.margin_mA)} below`;
  return `${sentence} The ceiling is ${amps(now.headroom_mA)} above, threshold ${below}.`;
}
