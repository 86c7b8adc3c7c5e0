import type { HAZARD_IDS } from "../model/bench.ts";
import { causeOf } from "../model/cause.ts";
import { MAKER_WORDS, makerOf } from "../model/ceiling.ts";
import type { EventKind } from "../model/event.ts";
import { HAZARD_ROWS } from "../model/hazard-rows.ts";
import { formatQuantity } from "../model/quantities.ts";
import { HAZARDS, type Hazard, hazardOfCause } from "./hazards.ts";
import {
  FLAG,
  NO_HAZARD,
  REFUSALS,
  type Refusal,
  type RequestName,
  STATE,
  type View,
} from "./records.ts";
import { isWatched, watchedNext, watchedSentence } from "./watch-words.ts";

/**
 * What the judge says, in sentences: present tense, subject first, cause named, numbers with their
 * unit, then what to do. Pure functions of numbers; nothing is judged here.
 */

/** Names of a bench that sentences use. */
export interface SentenceNames {
  readonly bench: string;
  /** Wavelength of the light that leaves, nm. */
  readonly wavelength_nm: number;
  /** Whether a crystal makes that light. */
  readonly pumped: boolean;
  /** Whether its controller takes no permits, so that nothing here knows how it starts. */
  readonly watched?: boolean;
}

/** How an event looks: calm is expected; warn and trip are not. */
export interface EventWords {
  readonly words: string;
  readonly weight: "calm" | "warn" | "trip";
}

/** Without a sample for this long, what is shown is called old, ms. */
export const SILENT_ms = 2000;

const amps = (current_mA: number): string => formatQuantity("current", current_mA, 10);
/** A limit is rounded down, so that typing what is read is never refused. */
const atMost = (current_mA: number): string => amps(Math.floor(current_mA / 10) * 10);
const milliwatts = (power_mW: number): string => formatQuantity("power", power_mW);
const degrees = (case_degC: number): string => formatQuantity("temperature", case_degC, 0.1);
const duration = (ms: number): string => formatQuantity("time", ms, ms < 1000 ? 1 : 1000);
const wavelength = (nm: number): string => formatQuantity("length", nm, 1);
/** Minutes ahead are told as minutes: a forecast has no seconds. */
const ahead = (s: number): string =>
  s < 60 ? "less than a minute" : `about ${Math.round(s / 60)}\u00a0min`;

/** What the bench does now, in one sentence. `age_ms` is the time since its last sample. */
export function stateSentence(names: SentenceNames, view: View, age_ms: number): string {
  const { bench } = names;
  const heard = age_ms < SILENT_ms && view.state !== STATE.offline;
  if (isWatched(view) && heard) return watchedSentence(bench, view);
  if (view.state === STATE.tripped) return trippedSentence(bench, view);
  if (view.state === STATE.offline) return `No controller answers for ${bench}.`;
  if (age_ms >= SILENT_ms) {
    const last = Number.isNaN(view.current_mA) ? "nothing" : amps(view.current_mA);
    return `Nothing heard from ${bench} for ${duration(age_ms)}. It last said ${last}; whether it is dark is not known here.`;
  }
  if (view.state === STATE.standby) return `${bench} is dark and ready.`;
  if (view.state === STATE.armed) return armedSentence(bench, view);
  return emittingSentence(names, view);
}

function trippedSentence(bench: string, view: View): string {
  const why = `${bench} went dark because ${causeOf(view.cause).words}.`;
  if ((view.flags & FLAG.unheard) === 0) return why;
  return `${why} No controller answers now; its light ends by itself with its permit.`;
}

function armedSentence(bench: string, view: View): string {
  if (view.delayLeft_ms > 0) {
    const left = duration(Math.ceil(view.delayLeft_ms / 1000) * 1000);
    return `${bench} is armed for ${amps(view.asked_mA)}; light comes in ${left}.`;
  }
  if (!(view.asked_mA > 0)) return `${bench} is armed at zero current.`;
  if ((view.flags & FLAG.capped) !== 0) {
    return `${bench} is armed and held dark by its ceiling, ${makerWords(view)}.`;
  }
  return `${bench} is armed for ${amps(view.asked_mA)}.`;
}

function emittingSentence(names: SentenceNames, view: View): string {
  const flows = `${names.bench} is emitting ${amps(view.current_mA)}`;
  const light = Number.isFinite(view.output_mW)
    ? `; ${milliwatts(view.output_mW)} leave at ${wavelength(names.wavelength_nm)}.`
    : ".";
  if ((view.flags & FLAG.capped) !== 0) {
    return `${flows}, held down from ${amps(view.asked_mA)} by its ceiling, ${makerWords(view)}${light}`;
  }
  const near_mA = Math.max(10, view.asked_mA * 0.01);
  if (Math.abs(view.current_mA - view.asked_mA) <= near_mA) return `${flows} as asked${light}`;
  return `${flows} on its way to ${amps(view.asked_mA)}${light}`;
}

const makerWords = (view: View): string => MAKER_WORDS[makerOf(view.maker)];

/** What comes next, or what to do, in one or two sentences. */
export function nextSentence(names: SentenceNames, view: View, age_ms: number): string {
  const heard = age_ms < SILENT_ms && view.state !== STATE.offline;
  if (isWatched(view) && heard) return watchedNext(view);
  if (view.state === STATE.tripped) return afterTrip(view);
  if (view.state === STATE.offline) {
    const then =
      names.watched === true ? "its light is not known here" : "when it answers it starts dark";
    return `It is being looked for; ${then}.`;
  }
  if (age_ms >= SILENT_ms) return "Look at the cable and at the board's supply.";
  if (view.state === STATE.standby) {
    return `At this case temperature it may have ${atMost(view.ceiling_mA)}; ${makerWords(view)} makes that ceiling.`;
  }
  if ((view.flags & FLAG.capped) !== 0) {
    return `It comes back toward ${amps(view.asked_mA)} by itself once the case has stayed cooler.`;
  }
  if (Number.isFinite(view.timeToCap_s)) {
    return `The case is warming: the ceiling comes down to ${amps(view.asked_mA)} in ${ahead(view.timeToCap_s)} and then holds the current down.`;
  }
  const room = `There is room to ${atMost(view.ceiling_mA)}`;
  if (view.state === STATE.armed || !Number.isFinite(view.floor_mA)) return `${room}.`;
  const floor = names.pumped ? "the crystal's floor" : "threshold";
  if (view.margin_mA < 0) return `${room}; the current is under ${floor}, ${amps(view.floor_mA)}.`;
  return `${room}; the current is ${amps(view.margin_mA)} above ${floor}.`;
}

function afterTrip(view: View): string {
  const cause = causeOf(view.cause);
  const look = rowOfAnyCause(view.cause)?.look ?? lookFirst(view.cause);
  return `${look} Light stays off until a person resets it, naming "${cause.id}", and arms again.`;
}

/** Where the board's own causes have the same meaning as a row of the host. */
const SAME_AS: Readonly<Record<number, number>> = {
  8: 65,
  9: 66,
  10: 79,
  11: 64,
  12: 68,
  13: 69,
  16: 74,
  17: 75,
};

const rowOfAnyCause = (cause: number): Hazard | undefined => hazardOfCause(SAME_AS[cause] ?? cause);

/** What to look at first after a trip that no row of the table explains. */
function lookFirst(cause: number): string {
  switch (causeOf(cause).id) {
    case "permit-expired":
      return "Look at what this computer was doing, and at the cable.";
    case "second-introduction":
      return "Look for a second program on this port.";
    case "bare-dark":
      return "Find out who pressed dark, or what disturbed the line.";
    case "power-lost":
    case "watchdog":
    case "brown-out":
      return "Look at the board's supply.";
    case "board-changed":
      return "Make sure that this is the board you mean.";
    case "host-restarted":
    case "daemon-stopped":
      return "Look why the daemon stopped.";
    default:
      return "Look at the record of the last minute.";
  }
}

/** One event in words. `a` and `b` are its two numbers as the judge gave them. */
export function eventWords(kind: EventKind, hazard: number, a: number, b: number): EventWords {
  switch (kind) {
    case "trip":
      return {
        words: `Dark: ${causeOf(hazard).words}${tripNumbers(hazard, a, b)}.`,
        weight: "trip",
      };
    case "warning":
      return {
        words: `${capital(warningReason(hazard))}: ${against(hazard, a, b)}.`,
        weight: "warn",
      };
    case "unenforced":
      return {
        words: `${capital(causeOf(hazard).words)}${tripNumbers(hazard, a, b)}. Nothing here cuts it.`,
        weight: "trip",
      };
    case "warning-over":
      return {
        words: overWords(hazard, a),
        weight: "calm",
      };
    case "capped":
      return { words: `Held down from ${amps(a)} by the ceiling, ${atMost(b)}.`, weight: "warn" };
    case "disconnected":
      return { words: "The controller is gone.", weight: "warn" };
    default:
      return { words: calmWords(kind, hazard, a, b), weight: "calm" };
  }
}

function calmWords(kind: EventKind, hazard: number, a: number, b: number): string {
  switch (kind) {
    case "connected":
      return "A controller introduced itself.";
    case "armed":
      return a > 0 ? `Armed for ${amps(a)}.` : "Back at zero current, still armed.";
    case "emitting":
      return `Light: ${amps(a)} asked, the case at ${degrees(b)}.`;
    case "light-seen":
      return `Current flows: ${amps(a)}.`;
    case "light-gone":
      return "No current flows any more.";
    case "dark":
      return `Dark: ${causeOf(hazard).words}.`;
    case "reset":
      return `Reset after "${causeOf(hazard).id}".`;
    case "uncapped":
      return `Let up to ${amps(a)} again; the ceiling is ${atMost(b)}.`;
    case "set":
      return amps(a) === amps(b)
        ? `${amps(a)} asked once more.`
        : `${amps(a)} asked instead of ${amps(b)}.`;
    case "refused":
      return `Refused: ${refusalReason(REFUSALS[a] ?? "board")}.`;
    default:
      return `${capital(kind)}.`;
  }
}

/** The row that an event's hazard names, whether by cause or as a row that only warns. */
function rowOfEvent(hazard: number): Hazard | undefined {
  if (hazard === NO_HAZARD) return undefined;
  return hazard < 0 ? HAZARDS[-1 - hazard] : hazardOfCause(hazard);
}

/** Warnings come before anything happened, so they name what nears its level, not a trip. */
const WARNS: Partial<Record<(typeof HAZARD_IDS)[number], string>> = {
  "over-ceiling": "the current stands close under the ceiling",
  "case-over": "the case is warm",
  "sample-gap": "samples come late",
  "output-low": "output is lower than this current should give",
  "tick-drift": "the board's clock and this computer's drift apart",
};

function warningReason(hazard: number): string {
  const row = rowOfEvent(hazard);
  return row === undefined ? "a warning" : (WARNS[row.id] ?? row.reason);
}

function inUnit(row: Hazard, value: number): string {
  const { level } = HAZARD_ROWS[row.id];
  if (level === "fact") return "";
  if (level === "temperature") return degrees(value);
  if (level === "ratio") return formatQuantity("ratio", value, 0.001);
  if (level === "time") return duration(value);
  return formatQuantity(level, value);
}

function against(hazard: number, a: number, b: number): string {
  const row = rowOfEvent(hazard);
  if (row === undefined) return "";
  return `${inUnit(row, a)}, and ${inUnit(row, b)} is where it warns`;
}

/** A warning's end. Of a gap, the number is how long it was; of the others, where they stand now. */
function overWords(hazard: number, a: number): string {
  const row = rowOfEvent(hazard);
  if (row?.id === "sample-gap") return `Samples come again, after ${duration(a)} without one.`;
  const value = row === undefined || Number.isNaN(a) ? "" : inUnit(row, a);
  return `No longer: ${warningReason(hazard)}${value === "" ? "" : `; now ${value}`}.`;
}

function tripNumbers(hazard: number, a: number, b: number): string {
  const row = hazardOfCause(hazard);
  if (row !== undefined) {
    const value = inUnit(row, a);
    return value === "" || Number.isNaN(a) ? "" : `: ${value}, and ${inUnit(row, b)} is its limit`;
  }
  if (causeOf(hazard).by !== "board" || Number.isNaN(a)) return "";
  return `; ${amps(a)} flowed and the case was at ${degrees(b)}`;
}

const REASONS: Readonly<Record<Refusal, string>> = {
  none: "nothing stands against it",
  offline: "no controller answers",
  "not-standby": "the bench is not in standby",
  "not-armed": "the bench is not armed",
  tripped: "the bench is tripped",
  "not-tripped": "the bench is not tripped",
  "above-ceiling": "the current is above the ceiling",
  "below-zero": "the current is not a number from zero up",
  "key-off": "the key is off",
  "loop-open": "the interlock loop is open",
  "no-curve": "the board holds no curve",
  sensor: "a sensor is open, shorted or out of range",
  "case-warm": "the case is too warm",
  "needs-hand": "nobody has moved a button or key at the bench within a minute",
  lockout: "the board is locked out",
  busy: "another exchange with the board is under way",
  board: "the board refuses",
  "wrong-cause": "another cause stands",
  "watch-only": "this bench is watched: its controller takes no orders for light from here",
  "not-built-in": "the scripted person may act on the built-in bench only",
  "no-answer": "the board does not answer",
  "went-dark": "dark was asked for meanwhile",
};

const refusalReason = (refusal: Refusal): string => REASONS[refusal];

/** What to do about a refusal that its reason alone does not tell. */
const ADVICE: Partial<Record<Refusal, string>> = {
  offline: "Look at the cable and the board's supply.",
  "not-standby": "Ask for dark first, or set another current.",
  "not-armed": "Arm it first.",
  "key-off": "Turn the key on.",
  "loop-open": "Close doors, covers and stop buttons of the loop.",
  "no-curve": "Wait until the curve is loaded, or reconnect.",
  sensor: "Look at the case sensor and its lead.",
  "case-warm": "Let it cool.",
  "watch-only": "Use its own controls, its key or its supply.",
  "needs-hand": "Press the button or move the key at the bench, then arm within a minute.",
  lockout: "The board's own lines tell why.",
  busy: "Wait a second and ask again.",
  "no-answer": "Look at the cable; nothing was switched on.",
  "went-dark": "Nothing was switched on; arm again if you mean it.",
};

/**
 * Why a request is refused and what to do instead.
 * @param value what was asked (mA for a current)
 * @param answerValue what the judge gave with the refusal: the ceiling, the standing cause, or NaN
 */
export function refusalWords(
  refusal: Refusal,
  value: number,
  answerValue: number,
  view: View,
): string {
  if (refusal === "above-ceiling") {
    return `${amps(value)} is above the ceiling, ${atMost(answerValue)} just now (${makerWords(view)}). Ask for ${atMost(answerValue)} or less.`;
  }
  if (refusal === "tripped" || refusal === "wrong-cause") {
    const cause = causeOf(answerValue);
    return `The bench is dark because ${cause.words}. Reset it by naming "${cause.id}".`;
  }
  const advice = ADVICE[refusal];
  return `${capital(refusalReason(refusal))}.${advice === undefined ? "" : ` ${advice}`}`;
}

/** What was done, to the person who asked for it. */
export function answerWords(bench: string, name: RequestName, value: number, view: View): string {
  switch (name) {
    case "arm":
      return `${bench} is armed for ${amps(view.asked_mA)}; light comes after the emission delay.`;
    case "set":
      return `${bench} goes to ${amps(value)}.`;
    case "reset":
      return `${bench} is reset and dark. Arm it to have light again.`;
    case "stop":
      return `${bench} is left dark.`;
    case "dark":
      return view.state === STATE.tripped
        ? `${bench} is ordered dark; it stays tripped because ${causeOf(view.cause).words}.`
        : `${bench} is ordered dark.`;
    default:
      return name satisfies never;
  }
}

/**
 * Reads back the current that a person typed, before arming: what it would give, and how much room
 * stays.
 * @param expected_mW output that the bench file's diode and crystal would give; NaN for not known
 */
export function readBack(
  names: SentenceNames,
  current_mA: number,
  expected_mW: number,
  view: View,
): string {
  if (current_mA > view.ceiling_mA) {
    return refusalWords("above-ceiling", current_mA, view.ceiling_mA, view);
  }
  const light = Number.isFinite(expected_mW)
    ? ` gives about ${milliwatts(expected_mW)} at ${wavelength(names.wavelength_nm)}`
    : ` lights ${names.bench}`;
  const room = amps(view.ceiling_mA - current_mA);
  return `${amps(current_mA)}${light}, with ${room} of room to the ceiling. Light comes some seconds after arming; wear eyewear first.`;
}

const capital = (text: string): string => text.charAt(0).toUpperCase() + text.slice(1);
