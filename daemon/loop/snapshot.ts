import type { Snapshot } from "../control/api.ts";
import { FLAG, STATE, STATES, type View } from "../judge/records.ts";
import { nextSentence, type SentenceNames, stateSentence } from "../judge/words.ts";
import { brokenLines } from "../link/counts.ts";
import type { Bench } from "../model/bench.ts";
import { causeOf } from "../model/cause.ts";
import { MAKER_WORDS, makerOf } from "../model/ceiling.ts";
import { formatQuantity } from "../model/quantities.ts";
import { enforcementOf, enforcementWords } from "../model/stream.ts";
import { linkWords } from "./link-words.ts";
import type { Loop } from "./loop.ts";

/** What the snapshot tells of things beside the loop. */
export interface Beside {
  readonly wall_ms: number;
  readonly now_ms: number;
  /** What the port says; empty while lines come. */
  readonly port: string;
  readonly recorder: { readonly behind_ms: number; readonly words: string };
}

/** The caution that stands wherever light can be switched on. */
export function safetyText(bench: Bench): string {
  // A pump is tuned to the crystal's line by its temperature; cold, it is some nanometres short.
  const whole = (nm: number): string => formatQuantity("length", Math.floor(nm), 1);
  const light =
    bench.crystal === null
      ? whole(bench.diode.wavelength_nm)
      : `${whole(bench.crystal.line_nm)} and ${whole(bench.crystal.wavelength_nm)}`;
  return `Not a certified safety function. Eyewear for ${light}, the enclosure, the key and the hardware interlock come first; local rules and your laser safety officer decide.`;
}

const known = (value: number): number | null => (Number.isFinite(value) ? value : null);

/** Names of a bench that sentences use. */
export function namesOf(bench: Bench): SentenceNames {
  return {
    bench: bench.name,
    wavelength_nm: bench.crystal?.wavelength_nm ?? bench.diode.wavelength_nm,
    pumped: bench.crystal !== null,
    watched: bench.controller.stream !== undefined,
  };
}

/** Everything one look needs, made from the loop as it stands. Allocates: not for every sample. */
export function snapshotOf(loop: Loop, beside: Beside): Snapshot {
  const { bench } = loop;
  const view = loop.out.view;
  const age_ms = beside.now_ms - loop.lastSample_ms;
  return {
    bench: bench.name,
    title: bench.title,
    at: beside.wall_ms,
    state: STATES[view.state] ?? "offline",
    capped: (view.flags & FLAG.capped) !== 0,
    // Not a number until the judge has met a board.
    delayLeft_ms: Math.max(0, known(view.delayLeft_ms) ?? 0),
    watchOnly: enforcementOf(bench.controller.stream) === "none",
    enforcement: enforcementOf(bench.controller.stream),
    enforced: enforcementWords(bench.controller.stream),
    builtIn: bench.controller.transport.kind === "built-in",
    hand: loop.session.manifest !== null && (loop.session.sample.status & (1 << 8)) !== 0,
    ...corridorOf(view),
    wavelength_nm: namesOf(bench).wavelength_nm,
    limit_mA: bench.limits.current_mA,
    caseTrip_degC: bench.hazards["case-over"].trip ?? 0,
    caseWarn_degC: bench.hazards["case-over"].warn ?? 0,
    cause: causePart(view),
    since: loop.telling.since,
    sentence: stateSentence(namesOf(bench), view, age_ms),
    next: nextSentence(namesOf(bench), view, age_ms),
    warnings: [...loop.telling.warnings].map(([hazard, w]) => ({ hazard, ...w })),
    age_ms: known(age_ms),
    link: linkPart(loop, view, beside.port),
    recorder: beside.recorder,
    safety: safetyText(bench),
  };
}

function causePart(view: View): Snapshot["cause"] {
  if (view.cause < 0 || view.state !== STATE.tripped) return null;
  const { code, id, words } = causeOf(view.cause);
  return { code, id, words };
}

function corridorOf(view: View) {
  const maker = makerOf(view.maker);
  return {
    asked_mA: known(view.asked_mA),
    aim_mA: known(view.aim_mA),
    current_mA: known(view.current_mA),
    ceiling_mA: known(view.ceiling_mA),
    maker,
    makerWords: MAKER_WORDS[maker],
    floor_mA: known(view.floor_mA),
    margin_mA: known(view.margin_mA),
    headroom_mA: known(view.headroom_mA),
    case_degC: known(view.case_degC),
    output_mW: known(view.output_mW),
    expected_mW: known(view.expected_mW),
    timeToCap_s: known(view.timeToCap_s),
  };
}

function linkPart(loop: Loop, view: View, port: string): Snapshot["link"] {
  const { session, bench } = loop;
  const counts = session.counts;
  return {
    phase: session.phase,
    words: linkWords(loop, port),
    rate_perS: session.manifest?.rate_perS ?? bench.controller.rate_perS,
    term_ms: bench.controller.term_ms,
    fall_ms: session.manifest?.fall_ms ?? 0,
    loopDelay_ms: known(view.loopDelay_ms),
    loopDelayWorst_ms: known(view.loopDelayWorst_ms),
    lost: counts.lost,
    garbled: counts.crc + counts.char,
    badLines: brokenLines(counts),
  };
}
