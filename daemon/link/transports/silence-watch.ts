import { SILENCE_LOOK_ms } from "./transport.ts";

/**
 * Ends a connection on which nothing comes any more. Ports that were unplugged do not always say
 * so, and then spin: this is the only sign there is.
 */
export class SilenceWatch {
  private last = performance.now();
  private timer: NodeJS.Timeout | null = null;

  /** @param silent called once, with the milliseconds of silence, when `limit_ms` have passed */
  start(limit_ms: number, silent: (ms: number) => void): void {
    this.last = performance.now();
    this.timer = setInterval(
      () => {
        const quiet = performance.now() - this.last;
        if (quiet < limit_ms) return;
        this.stop();
        silent(quiet);
      },
      Math.min(SILENCE_LOOK_ms, limit_ms / 4),
    );
  }

  heard(): void {
    this.last = performance.now();
  }

  stop(): void {
    if (this.timer !== null) clearInterval(this.timer);
    this.timer = null;
  }
}

/** Silence in words. */
export const silenceWords = (name: string, ms: number): string =>
  `${name} sent nothing for ${(ms / 1000).toFixed(1)} s. Check power, cable, firmware and baud rate.`;
