import type { Bench, CoolingPart, CrystalPart } from "../model/bench.ts";
import { absorbedShare } from "../physics/crystal.ts";
import { forward_mV, power_mW } from "../physics/diode.ts";
import { advance, type TwoNodeState } from "../physics/thermal.ts";
import { Chance } from "./chance.ts";

/**
 * The bench's physics: what current does to light and heat. The laws that the judge and the
 * estimators know come from physics/; the plant has effects that none of them has, so that no model
 * is checked against itself:
 *
 * - rollover: light is lost in proportion to heat in the junction beyond the law;
 * - memory: the table under the sink warms with a time constant of an hour and gives it back;
 * - hysteresis: the pump's wavelength follows its junction with a play of 0.05 nm;
 * - alignment: the resonator creeps, and is bumped now and then, partly coming back;
 * - lamp: a little room light reaches the photodiode.
 *
 * The numbers are invented for the demo; common practice, no source.
 */
export interface PlantOptions {
  readonly bench: Bench;
  readonly crystal: CrystalPart;
  readonly cooling: CoolingPart;
  readonly seed: number;
}

/** Time constant of the output stage, s: from full current to under 5 mA in less than 20 ms. */
const STAGE_s = 0.003;
const ROLLOVER_perW = 0.004;
const TABLE_s = 3600;
const TABLE_KperW = 0.4;
const PLAY_nm = 0.05;
const BUMPS_perS = 1 / (4 * 3600);
/** Share of residual pump light that passes the filter onto the photodiode. */
const LEAK = 0.01;

export class Plant {
  /** Current through the diode, mA. */
  current_mA = 0;
  readonly heat: TwoNodeState = { case_degC: 23, sink_degC: 23 };
  room_degC = 23;
  /** Share of nominal fan speed; 1 turns as it should. */
  fan = 1;
  /** What a person's hand adds to the alignment, relative output, 1 for untouched. */
  alignment = 1;
  output_mW = 0;
  pump_mW = 0;
  /** Light on the photodiode: output, leak and lamp, as if it were output, mW. */
  detected_mW = 0;
  readonly chance: Chance;
  readonly #bench: Bench;
  readonly #crystal: CrystalPart;
  readonly #cooling: CoolingPart;
  #time_s = 0;
  #table_K = 0;
  #pump_nm = Number.NaN;
  #bump = 0;
  #creep = 0;
  #wander_K = 0;

  constructor(options: PlantOptions) {
    this.#bench = options.bench;
    this.#crystal = options.crystal;
    this.#cooling = options.cooling;
    this.chance = new Chance(options.seed);
  }

  /** Moves the current by `dt_s`: the stage follows its drive, or falls where it is off. */
  electrical(dt_s: number, drive_mA: number, enabled: boolean): void {
    const aim = enabled ? drive_mA : 0;
    this.current_mA = aim + (this.current_mA - aim) * Math.exp(-dt_s / STAGE_s);
    if (this.current_mA < 0.01) this.current_mA = 0;
  }

  /** Moves heat and light by `dt_s` (a sample's period). */
  slow(dt_s: number): void {
    this.#time_s += dt_s;
    this.#room(dt_s);
    this.#light(dt_s);
    const volts = forward_mV(this.#bench.diode, this.current_mA) / 1000;
    const heat_W = (volts * this.current_mA - this.pump_mW) / 1000;
    this.#table_K += ((TABLE_KperW * heat_W - this.#table_K) * dt_s) / TABLE_s;
    const net = this.fan === 1 ? this.#cooling : slowerFan(this.#cooling, this.fan);
    advance(net, this.heat, heat_W, this.room_degC + this.#table_K, dt_s);
  }

  /** The evening cools, the morning warms, and a door opens now and then. */
  #room(dt_s: number): void {
    const hours = this.#time_s / 3600;
    this.#wander_K += this.chance.normal() * 0.25 * Math.sqrt(dt_s / 3600);
    this.#wander_K *= 1 - dt_s / (6 * 3600);
    this.room_degC = 23.5 + 1.2 * Math.cos(((hours + 2) * 2 * Math.PI) / 24) + this.#wander_K;
  }

  #light(dt_s: number): void {
    const { diode } = this.#bench;
    const cold_mW = power_mW(diode, this.current_mA, this.heat.case_degC);
    const volts = forward_mV(diode, this.current_mA) / 1000;
    const lost_W = (volts * this.current_mA - cold_mW) / 1000;
    this.pump_mW = cold_mW * (1 - ROLLOVER_perW * Math.max(0, lost_W) ** 2);
    const junction = this.heat.case_degC + (diode.rjc_KperW ?? 0) * lost_W;
    const share = absorbedShare(this.#crystal, this.#pumpWavelength(junction));
    const above_mW = Math.max(0, share * this.pump_mW - this.#crystal.threshold_mW);
    this.#mechanics(dt_s);
    const aligned = this.alignment * (1 + this.#creep + this.#bump);
    this.output_mW = this.#crystal.slope * above_mW * aligned;
    const lamp_mW = 0.6 + 0.05 * this.chance.normal();
    this.detected_mW = this.output_mW + LEAK * (1 - share) * this.pump_mW + lamp_mW;
  }

  #pumpWavelength(junction_degC: number): number {
    const { diode } = this.#bench;
    const law =
      diode.wavelength_nm + this.#crystal.pumpDrift_nmPerK * (junction_degC - diode.ref_degC);
    if (Number.isNaN(this.#pump_nm)) this.#pump_nm = law;
    const off = law - this.#pump_nm;
    if (Math.abs(off) > PLAY_nm) this.#pump_nm = law - Math.sign(off) * PLAY_nm;
    return this.#pump_nm;
  }

  #mechanics(dt_s: number): void {
    this.#creep += this.chance.normal() * 0.0015 * Math.sqrt(dt_s / 3600);
    // Half of a bump comes back within minutes, the rest stays as creep.
    this.#bump *= 1 - dt_s / 300;
    if (this.chance.uniform() < BUMPS_perS * dt_s) {
      const size = -0.01 * (0.5 + this.chance.uniform());
      this.#bump += size / 2;
      this.#creep += size / 2;
    }
  }
}

function slowerFan(cooling: CoolingPart, fan: number): CoolingPart {
  // Forced convection falls about as the 0.7th power of the flow; a still fan leaves a fifth.
  const flow = Math.max(0.2, fan ** 0.7);
  return { ...cooling, sinkToRoom_KperW: cooling.sinkToRoom_KperW / flow };
}
