import { type ChipState, CYCLES_PER_ms, Simulator } from "./simulator.ts";

/** A byte stream with a delay, whole or not at all: a buffer that can stick. */
class Pipe {
  /** While set, nothing leaves before this cycle. */
  stuckUntil = 0;
  /** Cycle at which what is put in now comes out. */
  exit(cycle: number): number {
    return Math.max(cycle, this.stuckUntil);
  }
}

interface Task {
  readonly cycle: number;
  readonly act: () => void | Promise<void>;
}

/** A line the host put on the wire, as it was, and when. */
export interface Recorded {
  readonly cycle: number;
  readonly bytes: Buffer;
}

/**
 * Simulated time round one simulated board: hands lines up and bytes down through pipes that can
 * stick, and carries out tasks at their cycle. Nothing here waits for the wall clock.
 */
export class World {
  readonly chip = new Simulator();
  readonly up = new Pipe();
  readonly down = new Pipe();
  /** Everything put on the board's receive wire. */
  readonly recorded: Recorded[] = [];
  /** Called with each line of the board, without its end. */
  onLine: (line: string) => void = () => {};
  now = 0;
  #tasks: Task[] = [];
  #partial = "";
  #state: ChipState | null = null;

  get state(): ChipState {
    if (this.#state === null) throw new Error("the world has not run yet");
    return this.#state;
  }

  /** Carries out `act` once simulated time has reached `cycle`. */
  at(cycle: number, act: () => void | Promise<void>): void {
    const after = this.#tasks.findIndex((task) => task.cycle > cycle);
    this.#tasks.splice(after < 0 ? this.#tasks.length : after, 0, { cycle, act });
  }

  /** Puts bytes on their way to the board. */
  send(bytes: Buffer): void {
    this.at(this.down.exit(this.now), async () => {
      this.recorded.push({ cycle: this.now, bytes });
      await this.chip.receive(bytes);
    });
  }

  sendLine(line: string): void {
    this.send(Buffer.from(`${line}\n`, "latin1"));
  }

  #arrive(bytes: Buffer): void {
    this.#partial += bytes.toString("latin1");
    const lines = this.#partial.split("\n");
    this.#partial = lines.pop() ?? "";
    for (const line of lines) this.at(this.up.exit(this.now), () => this.onLine(line));
  }

  async #tasksDue(): Promise<void> {
    for (;;) {
      const [task] = this.#tasks;
      if (task === undefined || task.cycle > this.now) return;
      this.#tasks.shift();
      await task.act();
    }
  }

  /** Runs until `cycle`, or until `done` holds behind a line or task; tells which. */
  async #runUntil(cycle: number, done: () => boolean): Promise<boolean> {
    for (;;) {
      await this.#tasksDue();
      if (done()) return true;
      if (this.now >= cycle) return false;
      const next = Math.min(cycle, this.#tasks[0]?.cycle ?? cycle);
      const { state, sent } = await this.chip.run(next - this.now);
      this.#state = state;
      this.now = state.cycle;
      for (const piece of sent) this.#arrive(piece.bytes);
    }
  }

  /** Lets so many milliseconds pass. */
  async pass(ms: number): Promise<void> {
    await this.#runUntil(this.now + ms * CYCLES_PER_ms, () => false);
  }

  /** Lets time pass until `done` holds; throws after `within_ms`. */
  async until(what: string, within_ms: number, done: () => boolean): Promise<void> {
    if (!(await this.#runUntil(this.now + within_ms * CYCLES_PER_ms, done))) {
      throw new Error(`${what} did not come within ${within_ms} ms of simulated time`);
    }
  }

  /** The cycle at which the board's tick has (or had) this value; late by less than a tick. */
  async cycleOfTick(tick: number): Promise<number> {
    const now = await this.chip.peek32("tick");
    return this.now + ((tick - now) | 0) * CYCLES_PER_ms;
  }

  /** Milliseconds from `cycle` to the first moment from then on without current; −1 while lit. */
  darkAfter_ms(cycle: number): number {
    let lit = false;
    for (const output of this.chip.outputs) {
      if (output.cycle <= cycle) lit = output.lit;
      else if (!output.lit && lit) return (output.cycle - cycle) / CYCLES_PER_ms;
    }
    return lit ? -1 : 0;
  }

  /** Milliseconds from `cycle` to the first moment from then on without pulse width; −1 while on. */
  cutAfter_ms(cycle: number): number {
    let drive = 0;
    for (const output of this.chip.outputs) {
      if (output.cycle <= cycle) drive = output.drive;
      else if (output.drive === 0 && drive > 0) return (output.cycle - cycle) / CYCLES_PER_ms;
    }
    return drive > 0 ? -1 : 0;
  }

  /** Whether current flowed at any time from `cycle` on. */
  litSince(cycle: number): boolean {
    return this.chip.outputs.some((o, i) => {
      const end = this.chip.outputs[i + 1]?.cycle ?? this.now;
      return o.lit && end > cycle;
    });
  }

  stop(): void {
    this.chip.stop();
  }
}
