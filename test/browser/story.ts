import type { EventLine, Snapshot } from "../../daemon/control/api.ts";

/**
 * An invented evening of the bench "north", for pictures: plain formulas, no physics worth the name.
 * The last 40 minutes end at `at`; `minute` runs from 0 (40 minutes ago) to 40 (now).
 */
export type Kind = "near" | "held" | "calm" | "tripped" | "standby";

const MINUTES = 40;
const STEP_s = 1;

interface Moment {
  readonly t: number;
  readonly state: number;
  readonly asked: number;
  readonly current: number;
  readonly ceiling: number;
  readonly maker: number;
  readonly floor: number;
  readonly output: number;
  readonly expected: number;
  readonly degC: number;
}

/** A repeatable stand-in for noise, −1 … 1. */
const ripple = (n: number): number => {
  const x = Math.sin(n * 12.9898) * 43758.5453;
  return 2 * (x - Math.floor(x)) - 1;
};

function askedAt(kind: Kind, minute: number): number {
  if (kind === "standby" || minute < 0.1) return 0;
  if (kind === "calm") return 1450;
  if (kind === "near" && minute >= 30.5) return 1580;
  if (kind === "tripped" && minute >= 33.4) return 0;
  return 1800;
}

const derating = (degC: number): number => Math.min(2100, 1540 + (42 - degC) * 40);

function moment(kind: Kind, at: number, second: number): Moment {
  const minute = second / 60;
  const asked = askedAt(kind, minute);
  const settle = kind === "calm" ? 36.4 : kind === "standby" ? 24 : 40.6;
  const warm = kind === "tripped" ? Math.min(minute, 33.4) : minute;
  let degC = settle - (settle - 24) * Math.exp(-warm / 14);
  if (kind === "tripped" && minute > 33.4) degC = 27 + (degC - 27) * Math.exp(-(minute - 33.4) / 6);
  const byCase = derating(degC + 0.3);
  const ceiling = Math.min(1900, byCase);
  const ramp = Math.min(1, Math.max(0, (minute - 0.1) * 6));
  const current = Math.min(asked * ramp, ceiling);
  const floor = 830 + 1.4 * (degC - 30) ** 2 * 0.6;
  const lit = asked > 0;
  const ideal = Math.max(0, 0.41 * (current - floor) - 0.9 * (degC - 34) ** 2 * 0.4);
  const bump = kind === "near" && minute > 33.6 ? 0.974 : 1;
  return {
    t: at - (MINUTES * 60 - second) * 1000,
    state: lit ? 3 : kind === "tripped" && minute > 1 ? 4 : 1,
    asked,
    current: current * (1 + 0.0006 * ripple(second)),
    ceiling,
    maker: byCase < 1900 ? 0 : 2,
    floor,
    output: lit ? ideal * bump * (1 + 0.003 * ripple(second + 0.5)) + 3 : 0,
    expected: lit ? ideal : Number.NaN,
    degC: degC + 0.03 * ripple(second + 0.7),
  };
}

/** Every second of the evening. */
export function evening(kind: Kind, at: number): Moment[] {
  const out: Moment[] = [];
  for (let s = 0; s <= MINUTES * 60; s += STEP_s) out.push(moment(kind, at, s));
  return out;
}

const WORDS: Readonly<Record<Kind, readonly [string, string]>> = {
  near: [
    "north is emitting 1.58 A as asked; 322 mW leave at 1064 nm.",
    "Next: the ceiling comes down to 1.58 A in about 13 min, and the current is then held down.",
  ],
  held: [
    "north is emitting 1.61 A, held down from 1.80 A by its ceiling, the derating for the case. 300 mW leave at 1064 nm.",
    "Next: the case still warms; the current goes down with its ceiling.",
  ],
  calm: ["north is emitting 1.45 A as asked; 250 mW leave at 1064 nm.", "Next: nothing."],
  tripped: [
    "north is dark because the interlock loop opened. It stays dark until you reset it, naming the cause.",
    "Next: nothing by itself.",
  ],
  standby: ["north is dark and in standby.", "Next: nothing until you arm it."],
};

/** What the switch would say at the end of that evening. */
export function snapshotOf(kind: Kind, at: number): Snapshot {
  const m = moment(kind, at, MINUTES * 60);
  const lit = m.state === 3;
  const tripped = kind === "tripped";
  const [sentence, next] = WORDS[kind];
  const shown = `${(m.current / 1000).toFixed(2)} A`;
  return {
    bench: "north",
    title: "a pump diode and a crystal",
    at,
    state: tripped ? "tripped" : lit ? "emitting" : "standby",
    capped: kind === "held",
    delayLeft_ms: 0,
    watchOnly: false,
    enforcement: "permit",
    enforced: "Light needs a permit for every judged sample.",
    builtIn: true,
    hand: false,
    asked_mA: m.asked,
    aim_mA: m.current,
    current_mA: m.current,
    ceiling_mA: m.ceiling,
    maker: m.maker === 0 ? "derating" : "bench",
    makerWords: m.maker === 0 ? "the derating for the case" : "the bench limit",
    floor_mA: m.floor,
    margin_mA: m.current - m.floor,
    headroom_mA: m.ceiling - m.current,
    case_degC: m.degC,
    output_mW: m.output,
    expected_mW: lit ? m.expected : null,
    wavelength_nm: 1064,
    limit_mA: 1900,
    caseTrip_degC: 50,
    caseWarn_degC: 42,
    timeToCap_s: kind === "near" ? 780 : null,
    cause: tripped ? { code: 17, id: "loop-open", words: "the interlock loop opened" } : null,
    since: tripped ? at - 6.6 * 60_000 : at - 30 * 60_000,
    sentence: sentence
      .replace(/1\.\d\d A(?= as asked|, held)/, shown)
      .replace(/\d+ mW/, `${m.output.toFixed(0)} mW`),
    next,
    warnings: warningsOf(kind, at),
    age_ms: 12,
    link: LINK,
    recorder: { behind_ms: 0, words: "" },
    safety: SAFETY,
  };
}

const LINK: Snapshot["link"] = {
  phase: "ready",
  words: "",
  rate_perS: 50,
  term_ms: 500,
  fall_ms: 5,
  loopDelay_ms: 4,
  loopDelayWorst_ms: 31,
  lost: 0,
  garbled: 0,
  badLines: 0,
};

const SAFETY =
  "Not a certified safety function. Eyewear for 808 nm and 1064 nm, the enclosure, the key and the hardware interlock come first; local rules and your laser safety officer decide.";

const warningsOf = (kind: Kind, at: number): Snapshot["warnings"] =>
  kind === "near"
    ? [
        {
          hazard: "output-low",
          words: "The output stepped down 2.6 % while current and case held still",
          since: at - 6.4 * 60_000,
        },
      ]
    : [];

/** The evening's events. */
export function eventsOf(kind: Kind, at: number): EventLine[] {
  if (kind === "standby") return [];
  const minute = (m: number): number => at - (MINUTES - m) * 60_000;
  const line = (
    id: number,
    m: number,
    name: string,
    weight: EventLine["weight"],
    words: string,
    hazard = "",
  ): EventLine => ({ id, at: minute(m), kind: name, hazard, weight, words });
  const out = [
    line(1, 0.05, "armed", "calm", "Armed for 1.80 A by a page."),
    line(2, 0.1, "emitting", "calm", "Light at 1064 nm."),
  ];
  if (kind !== "calm") {
    out.push(line(3, heldFrom(kind, at), "capped", "warn", "Held down from 1.80 A."));
  }
  if (kind === "near") {
    out.push(line(4, 30.5, "set", "calm", "1.58 A set by a page."));
    out.push(line(5, 33.6, "warning", "warn", "Output stepped down.", "output-low"));
  }
  if (kind === "tripped") {
    out.push(line(6, 33.4, "trip", "trip", "The interlock loop opened.", "loop-open"));
  }
  return out;
}

function heldFrom(kind: Kind, at: number): number {
  const i = evening(kind, at).findIndex((m, s) => s > 60 && m.asked > m.ceiling);
  return i < 0 ? 25 : i / 60;
}
