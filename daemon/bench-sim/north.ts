import { newController, type SimController } from "../../firmware-protocol/wasm/controller.ts";
import type { Bench } from "../model/bench.ts";
import { Converters, SET_mAperCOUNT } from "./converters.ts";
import { Plant } from "./plant.ts";

export interface NorthOptions {
  readonly bench: Bench;
  readonly module: WebAssembly.Module;
  readonly seed: number;
  readonly rate_perS: number;
  /** Length of a main-loop pass, ms: 1 live, 5 in time-lapse. */
  readonly pass_ms: number;
  /** Tick that the board's clock shows at its start. */
  readonly tick: number;
}

/**
 * The built-in bench: the plant, its converters, and between them and the daemon the same controller
 * core that a real board runs, on a simulated clock. Bytes go in, bytes come out.
 */
export class North {
  readonly controller: SimController;
  readonly plant: Plant;
  /** Switches a person has: all in order until somebody turns them. */
  readonly hands = { key: true, loop: true, fan: true, hand: false };
  /** Called with what the board sends, as soon as it does. */
  onBytes: (bytes: Uint8Array) => void = () => {};
  /** Called with the readings before the board sees them, for faults of a sensor. */
  tamper: (values: Int32Array) => void = () => {};
  readonly #converters: Converters;
  readonly #options: NorthOptions;
  readonly #period_ms: number;
  #elapsed_ms = 0;
  #nextReading_ms: number;

  constructor(options: NorthOptions) {
    this.#options = options;
    this.#period_ms = 1000 / options.rate_perS;
    this.#nextReading_ms = this.#period_ms;
    const { bench, seed } = options;
    const { crystal, cooling } = bench;
    if (crystal === null || cooling === null) {
      throw new Error(
        "The built-in bench's file has no crystal or no cooling; both are simulated.",
      );
    }
    this.plant = new Plant({ bench, crystal, cooling, seed });
    this.#converters = new Converters(bench);
    this.controller = newController(options.module, { rate_perS: options.rate_perS, jitter: seed });
    this.controller.boot("power", options.tick);
    this.#emit();
  }

  /** Milliseconds of simulated time since the board's start. */
  get elapsed_ms(): number {
    return this.#elapsed_ms;
  }

  /** Bytes from the host. */
  write(bytes: Uint8Array): void {
    this.controller.receive(bytes);
  }

  /** Runs board and plant up to that much simulated time, pass by pass. */
  advance(to_ms: number): void {
    const { pass_ms } = this.#options;
    while (this.#elapsed_ms + pass_ms <= to_ms) this.#pass(pass_ms);
  }

  #pass(pass_ms: number): void {
    this.#elapsed_ms += pass_ms;
    const tick = (this.#options.tick + Math.round(this.#elapsed_ms)) >>> 0;
    const { controller, plant } = this;
    plant.electrical(pass_ms / 1000, controller.drive_counts * SET_mAperCOUNT, controller.enabled);
    controller.conversion(this.#converters.current(plant), tick);
    controller.inputs(this.hands.key, this.hands.loop, this.hands.fan, this.hands.hand);
    if (this.#elapsed_ms >= this.#nextReading_ms) {
      this.#nextReading_ms += this.#period_ms;
      plant.slow(this.#period_ms / 1000);
      const values = this.#converters.read(plant, controller.drive_counts);
      this.tamper(values);
      controller.reading(values, tick);
    }
    controller.pass(tick);
    this.#emit();
  }

  #emit(): void {
    const bytes = this.controller.sent();
    if (bytes.length > 0) this.onBytes(bytes);
  }
}
