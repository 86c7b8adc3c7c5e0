import { type ChildProcessWithoutNullStreams, spawn, spawnSync } from "node:child_process";
import { createInterface } from "node:readline";
import { packageRoot } from "../../daemon/paths.ts";

/** Clock of the simulated chip. */
export const CYCLES_PER_ms = 16_000;

const BOARD_FOLDER = `${packageRoot}/firmware-protocol/boards/atmega328p`;
const RUNNER_FOLDER = `${packageRoot}/test/hardware/simavr`;
const FIRMWARE = `${BOARD_FOLDER}/build/firmware.elf`;
const RUNNER = `${RUNNER_FOLDER}/build/runner`;

const make = (folder: string): string => {
  const result = spawnSync("make", ["-s", "-C", folder], { encoding: "utf8" });
  if (result.error !== undefined || result.status !== 0) {
    throw new Error(
      `make in ${folder} failed. It needs gcc-avr, avr-libc, libsimavr-dev, libelf-dev and make.\n` +
        `${result.error?.message ?? ""}${result.stdout ?? ""}${result.stderr ?? ""}`,
    );
  }
  return result.stdout;
};

/** Builds firmware and runner where they are older than their sources; returns what make said. */
export const buildSimulator = (): string => {
  make(RUNNER_FOLDER);
  return make(BOARD_FOLDER);
};

/** Builds runner and the firmware of a folder of tests; returns the path of what was built. */
export const buildOther = (folder: string, file: string): string => {
  make(RUNNER_FOLDER);
  make(`${packageRoot}/test/hardware/${folder}`);
  return `${packageRoot}/test/hardware/${folder}/build/${file}`;
};

/** A runner process; `arguments_` go behind the firmware's path. */
export const spawnRunner = (
  arguments_: readonly string[],
  firmware: string = FIRMWARE,
): ChildProcessWithoutNullStreams =>
  spawn(RUNNER, [firmware, ...arguments_], { stdio: ["pipe", "pipe", "pipe"] });

/** The pins that make light, at one moment. */
export interface Output {
  readonly cycle: number;
  /** Pulse width that reaches the pin, counts of `set`. */
  readonly drive: number;
  /** Whether the one-shot behind the enable pin holds the output stage on. */
  readonly stage: boolean;
  readonly indicator: boolean;
  /** Whether current flows: above 5 mA. */
  readonly lit: boolean;
}

export interface ChipState extends Output {
  /** Rising edges of the enable pin since the start. */
  readonly edges: number;
  readonly current_mA: number;
  readonly case_degC: number;
}

export const readState = (words: readonly string[]): ChipState => {
  const n = words.map(Number);
  return {
    cycle: n[0] ?? 0,
    drive: n[1] ?? 0,
    stage: n[2] === 1,
    indicator: n[3] === 1,
    lit: n[4] === 1,
    edges: n[5] ?? 0,
    current_mA: (n[6] ?? 0) / 1000,
    case_degC: (n[7] ?? 0) / 1000,
  };
};

/** What happened while the chip ran. */
export interface RunReport {
  readonly state: ChipState;
  /** Bytes sent, each piece with the cycle of its last byte. */
  readonly sent: readonly { readonly cycle: number; readonly bytes: Buffer }[];
}

/**
 * The board's firmware on a simulated chip, in lockstep: its time moves only in `run`, so that a
 * run gives the same bytes on any machine.
 */
export class Simulator {
  /** Every change of the output since the start. */
  readonly outputs: Output[] = [];
  /** Cycle of every reset since the start. */
  readonly boots: number[] = [];
  #child: ChildProcessWithoutNullStreams;
  #waiting: ((line: string) => void) | null = null;
  #lines: string[] = [];
  #stderr = "";

  /** @param firmware another firmware than the board's own, as `buildOther` gives it */
  constructor(firmware?: string) {
    this.#child = spawnRunner([], firmware);
    createInterface({ input: this.#child.stdout }).on("line", (line) => {
      const waiting = this.#waiting;
      this.#waiting = null;
      if (waiting === null) this.#lines.push(line);
      else waiting(line);
    });
    this.#child.stderr.on("data", (text: Buffer) => {
      this.#stderr += text.toString();
    });
    this.#child.on("exit", () => this.#waiting?.("no the runner ended"));
  }

  #line(): Promise<string> {
    const line = this.#lines.shift();
    if (line !== undefined) return Promise.resolve(line);
    return new Promise((resolve) => {
      this.#waiting = resolve;
    });
  }

  async #answer(command: string, event: (words: string[]) => void): Promise<string[]> {
    this.#child.stdin.write(`${command}\n`);
    for (;;) {
      const words = (await this.#line()).split(" ");
      if (words[0] === "ok") return words.slice(1);
      if (words[0] === "no") {
        throw new Error(`${command.slice(0, 60)}: ${words.slice(1).join(" ")}. ${this.#stderr}`);
      }
      event(words);
    }
  }

  /** Any command of simavr/commands.h but `run`. */
  command(text: string): Promise<string[]> {
    return this.#answer(text, () => {});
  }

  /** Lets the chip run for so many cycles, or until it has sent a line end. */
  async run(cycles: number): Promise<RunReport> {
    const sent: { cycle: number; bytes: Buffer }[] = [];
    const words = await this.#answer(`run ${Math.max(1, Math.ceil(cycles))} line`, (event) => {
      const cycle = Number(event[1]);
      if (event[0] === "tx") sent.push({ cycle, bytes: Buffer.from(event[2] ?? "", "hex") });
      else if (event[0] === "boot") this.boots.push(cycle);
      else if (event[0] === "out") this.outputs.push(readState(event.slice(1)));
    });
    return { state: readState(words), sent };
  }

  /** Puts bytes on the board's receive wire. */
  async receive(bytes: Buffer): Promise<void> {
    if (bytes.length > 0) await this.command(`rx ${bytes.toString("hex")}`);
  }

  /** A 32-bit variable of the firmware, by its name. */
  async peek32(symbol: string): Promise<number> {
    const [hex] = await this.command(`peek ${symbol} 0 4`);
    return Buffer.from(hex ?? "", "hex").readUInt32LE();
  }

  async poke32(symbol: string, value: number): Promise<void> {
    const bytes = Buffer.alloc(4);
    bytes.writeUInt32LE(value >>> 0);
    await this.command(`poke ${symbol} 0 ${bytes.toString("hex")}`);
  }

  stop(): void {
    this.#child.kill("SIGKILL");
  }
}
