import { type ChildProcess, spawn } from "node:child_process";
import { existsSync } from "node:fs";
import { vi } from "vitest";

/** A pseudo-terminal that stands for a serial port; what hangs on it is said here. */
export class Pty {
  readonly path: string;
  readonly #socat: ChildProcess;
  #timer: NodeJS.Timeout | undefined;

  private constructor(path: string) {
    this.path = path;
    this.#socat = spawn("socat", [`pty,raw,echo=0,link=${path}`, "-"], {
      stdio: ["pipe", "ignore", "ignore"],
    });
  }

  /** Resolves when the device is there. */
  static async at(path: string): Promise<Pty> {
    const pty = new Pty(path);
    await vi.waitFor(
      () => {
        if (!existsSync(path)) throw new Error(`${path} is not there`);
      },
      { timeout: 20_000, interval: 20 },
    );
    return pty;
  }

  /** Sends these bytes again and again, as a device does that knows nothing of us. */
  repeat(bytes: Buffer, every_ms: number): void {
    this.#timer = setInterval(() => this.#socat.stdin?.write(bytes), every_ms);
  }

  stop(): void {
    clearInterval(this.#timer);
    this.#socat.kill("SIGKILL");
  }
}
