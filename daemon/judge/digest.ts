import type { Out, View } from "./records.ts";

/**
 * A cheap 32-bit digest of what steps order and tell, so that two runs can be compared by one
 * number. It finds accidents, not attacks.
 */
const cell = new Float64Array(1);
const halves = new Uint32Array(cell.buffer);

/** Constants of 32-bit FNV-1a, used here on whole words. */
export const DIGEST_START = 0x811c9dc5 | 0;
const PRIME = 0x01000193;

function mix(hash: number): number {
  const low = Math.imul(hash ^ (halves[0] as number), PRIME);
  const high = Math.imul(low ^ (low >>> 15) ^ (halves[1] as number), PRIME);
  return high ^ (high >>> 13);
}

/** Every NaN counts as the same one: their bits may differ between two runs of one program. */
function mixNumber(hash: number, value: number): number {
  cell[0] = Number.isNaN(value) ? Number.MAX_VALUE : value;
  return mix(hash);
}

/** `hash` with one outcome mixed in; begin with DIGEST_START. */
export function mixOut(hash: number, out: Out): number {
  let h = mixNumber(hash, out.dark);
  h = mixNumber(h, out.permit);
  h = mixNumber(h, out.permitSeq);
  h = mixNumber(h, out.cap_counts);
  h = mixNumber(h, out.aim_counts);
  h = mixNumber(h, out.term_ticks);
  h = mixNumber(h, out.order);
  h = mixNumber(h, out.orderValue);
  h = mixNumber(h, out.answer);
  h = mixNumber(h, out.answerId);
  h = mixNumber(h, out.refusal);
  h = mixNumber(h, out.answerValue);
  h = mixNumber(h, out.deadline_ms);
  h = mixNumber(h, out.eventCount);
  for (let i = 0; i < out.eventCount; i++) {
    h = mixNumber(h, out.eventKind[i] as number);
    h = mixNumber(h, out.eventHazard[i] as number);
    h = mixNumber(h, out.eventA[i] as number);
    h = mixNumber(h, out.eventB[i] as number);
  }
  return mixView(h, out.view);
}

function mixView(hash: number, view: View): number {
  let h = mixNumber(hash, view.state);
  h = mixNumber(h, view.flags);
  h = mixNumber(h, view.cause);
  h = mixNumber(h, view.asked_mA);
  h = mixNumber(h, view.aim_mA);
  h = mixNumber(h, view.current_mA);
  h = mixNumber(h, view.case_degC);
  h = mixNumber(h, view.output_mW);
  h = mixNumber(h, view.ceiling_mA);
  h = mixNumber(h, view.maker);
  h = mixNumber(h, view.floor_mA);
  h = mixNumber(h, view.margin_mA);
  h = mixNumber(h, view.headroom_mA);
  h = mixNumber(h, view.expected_mW);
  h = mixNumber(h, view.caseSlope_KperS);
  h = mixNumber(h, view.timeToCap_s);
  h = mixNumber(h, view.delayLeft_ms);
  h = mixNumber(h, view.loopDelay_ms);
  return mixNumber(h, view.loopDelayWorst_ms);
}
