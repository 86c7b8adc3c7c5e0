import type { CoolingPart } from "../model/bench.ts";

/**
 * The two-node network: `C1 dT1/dt = Q − (T1 − T2)/R12`, `C2 dT2/dt = (T1 − T2)/R12 − (T2 − Ta)/R2a`,
 * node 1 the case, node 2 the sink. Heat in watts, time in seconds, temperatures in °C.
 */
export interface TwoNodeState {
  case_degC: number;
  sink_degC: number;
}

/** Rate of change of the case, K/s. */
export function caseRate_KperS(net: CoolingPart, state: TwoNodeState, heat_W: number): number {
  const flow_W = (state.case_degC - state.sink_degC) / net.caseToSink_KperW;
  return (heat_W - flow_W) / net.case_JperK;
}

/** Rate of change of the sink, K/s. */
export function sinkRate_KperS(net: CoolingPart, state: TwoNodeState, room_degC: number): number {
  const flow_W = (state.case_degC - state.sink_degC) / net.caseToSink_KperW;
  return (flow_W - (state.sink_degC - room_degC) / net.sinkToRoom_KperW) / net.sink_JperK;
}

/** Writes where the network settles into `out`. */
export function settle(
  net: CoolingPart,
  heat_W: number,
  room_degC: number,
  out: TwoNodeState,
): void {
  out.sink_degC = room_degC + heat_W * net.sinkToRoom_KperW;
  out.case_degC = out.sink_degC + heat_W * net.caseToSink_KperW;
}

/**
 * Moves the network by any time under constant heat and room temperature, exactly: the matrix
 * exponential of a 2 × 2 matrix with two distinct negative eigenvalues, in closed form. No step is
 * too long. Writes into `state`.
 */
export function advance(
  net: CoolingPart,
  state: TwoNodeState,
  heat_W: number,
  room_degC: number,
  by_s: number,
): void {
  const a = -1 / (net.caseToSink_KperW * net.case_JperK);
  const b = -a;
  const c = 1 / (net.caseToSink_KperW * net.sink_JperK);
  const d = -c - 1 / (net.sinkToRoom_KperW * net.sink_JperK);
  const settledSink = room_degC + heat_W * net.sinkToRoom_KperW;
  const settledCase = settledSink + heat_W * net.caseToSink_KperW;
  const x = state.case_degC - settledCase;
  const y = state.sink_degC - settledSink;
  const mean = (a + d) / 2;
  const spread = Math.sqrt(((a - d) / 2) ** 2 + b * c);
  // exp(M·t) = e^(mean·t)·(cosh(spread·t)·1 + sinh(spread·t)/spread·(M − mean·1)), written with the
  // two decaying exponentials so that nothing overflows for long times.
  const slow = Math.exp((mean + spread) * by_s);
  const fast = Math.exp((mean - spread) * by_s);
  const even = (slow + fast) / 2;
  const odd = (slow - fast) / (2 * spread);
  state.case_degC = settledCase + even * x + odd * ((a - mean) * x + b * y);
  state.sink_degC = settledSink + even * y + odd * (c * x + (d - mean) * y);
}

/** A step response as a sum of two exponentials: ΔT(t) = Q · Σ R·(1 − exp(−t/τ)). */
export interface Foster {
  readonly fast_KperW: number;
  readonly fast_s: number;
  readonly slow_KperW: number;
  readonly slow_s: number;
}

/** The case's step response in that form, from the network. */
export function fosterOf(net: CoolingPart): Foster {
  const r1 = net.caseToSink_KperW;
  const r2 = net.sinkToRoom_KperW;
  const c1 = net.case_JperK;
  const c2 = net.sink_JperK;
  // Driving-point impedance: (r1 + r2 + s·r1·r2·c2) / (1 + s·(r1·c1 + r2·c1 + r2·c2) + s²·r1·r2·c1·c2)
  const sum = r1 * c1 + r2 * c1 + r2 * c2;
  const product = r1 * r2 * c1 * c2;
  const root = Math.sqrt(sum * sum - 4 * product);
  const slow_s = (sum + root) / 2;
  const fast_s = product / slow_s;
  const weigh = (tau: number, other: number): number =>
    ((r1 + r2) * tau - r1 * r2 * c2) / (tau - other);
  return {
    fast_KperW: weigh(fast_s, slow_s),
    fast_s,
    slow_KperW: weigh(slow_s, fast_s),
    slow_s,
  };
}

/** Rise of the case above its start, K, `after_s` seconds after a step of that heat from rest. */
export function stepRise_K(foster: Foster, heat_W: number, after_s: number): number {
  const fast = -Math.expm1(-after_s / foster.fast_s) * foster.fast_KperW;
  const slow = -Math.expm1(-after_s / foster.slow_s) * foster.slow_KperW;
  return heat_W * (fast + slow);
}

/** Rise that is left, K, `after_s` seconds after that heat ended, from the settled state. */
export function stepFall_K(foster: Foster, heat_W: number, after_s: number): number {
  const fast = Math.exp(-after_s / foster.fast_s) * foster.fast_KperW;
  const slow = Math.exp(-after_s / foster.slow_s) * foster.slow_KperW;
  return heat_W * (fast + slow);
}

/**
 * How strongly a ceiling that falls with the case pulls the settled current down:
 * L = |dc/dT| · R · dQ/dI, dimensionless. Above 1 a capped bench hunts.
 */
export function loopGain(
  fall_mAperK: number,
  caseToRoom_KperW: number,
  heatPerCurrent_mV: number,
): number {
  return ((Math.abs(fall_mAperK) * caseToRoom_KperW) / 1000) * (heatPerCurrent_mV / 1000);
}
