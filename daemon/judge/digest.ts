import { EVENTS_PER_STEP_MAX, type Out, type View } from "./records.ts";

/**
 * A cheap 32-bit digest of what steps order and tell, so that two runs can be compared by one
 * number. It finds accidents, not attacks.
 */

/** Numbers of an outcome beside its events, and of one event. */
const OUT_NUMBERS = 33;
const EVENT_NUMBERS = 4;
const cells = new Float64Array(OUT_NUMBERS + EVENT_NUMBERS * EVENTS_PER_STEP_MAX);
const words = new Uint32Array(cells.buffer);

/** Start value and prime of 32-bit FNV-1a, used here on whole words. */
export const DIGEST_START = 0x811c9dc5 | 0;
const PRIME = 0x01000193;

/** `hash` with one outcome mixed in; begin with DIGEST_START. Allocates nothing. */
export function mixOut(hash: number, out: Out): number {
  writeOrders(out);
  writeView(out.view);
  let used = OUT_NUMBERS;
  for (let i = 0; i < out.eventCount; i++) {
    cells[used++] = out.eventKind[i] as number;
    cells[used++] = out.eventHazard[i] as number;
    cells[used++] = out.eventA[i] as number;
    cells[used++] = out.eventB[i] as number;
  }
  let h = hash;
  for (let i = 0; i < used; i++) {
    // Every NaN counts as the same one: their bits may differ between two runs of one program.
    if (Number.isNaN(cells[i] as number)) cells[i] = Number.MAX_VALUE;
    h = Math.imul(h ^ (words[2 * i] as number), PRIME);
    h = Math.imul(h ^ (h >>> 15) ^ (words[2 * i + 1] as number), PRIME);
    h ^= h >>> 13;
  }
  return h;
}

function writeOrders(out: Out): void {
  cells[0] = out.dark;
  cells[1] = out.permit;
  cells[2] = out.permitSeq;
  cells[3] = out.cap_counts;
  cells[4] = out.aim_counts;
  cells[5] = out.term_ticks;
  cells[6] = out.order;
  cells[7] = out.orderValue;
  cells[8] = out.answer;
  cells[9] = out.answerId;
  cells[10] = out.refusal;
  cells[11] = out.answerValue;
  cells[12] = out.deadline_ms;
  cells[13] = out.eventCount;
}

function writeView(view: View): void {
  cells[14] = view.state;
  cells[15] = view.flags;
  cells[16] = view.cause;
  cells[17] = view.asked_mA;
  cells[18] = view.aim_mA;
  cells[19] = view.current_mA;
  cells[20] = view.case_degC;
  cells[21] = view.output_mW;
  cells[22] = view.ceiling_mA;
  cells[23] = view.maker;
  cells[24] = view.floor_mA;
  cells[25] = view.margin_mA;
  cells[26] = view.headroom_mA;
  cells[27] = view.expected_mW;
  cells[28] = view.caseSlope_KperS;
  cells[29] = view.timeToCap_s;
  cells[30] = view.delayLeft_ms;
  cells[31] = view.loopDelay_ms;
  cells[32] = view.loopDelayWorst_ms;
}
