/** Causes that an ending daemon leaves behind. */
export const BY_PERSON = 0;
export const DAEMON_STOPPED = 85;
export const HOST_DEFECT = 87;

/** Exit code after a defect of our own, and how long the last line may take to leave, ms. */
const DEFECT_EXIT = 70;
const WRITTEN_ms_MAX = 50;

/** What ends the daemon, and which cause it leaves: a person (0), or the system stopping it. */
export class Ending {
  #resolve: (cause: number) => void = () => {};
  readonly #ended: Promise<number>;

  /** @param suspended called where Ctrl-Z asks to stop the process, which is not done */
  constructor(suspended: () => void) {
    this.#ended = new Promise((resolve) => {
      this.#resolve = resolve;
    });
    process.on("SIGINT", () => this.now(BY_PERSON));
    process.on("SIGTERM", () => this.now(DAEMON_STOPPED));
    process.on("SIGHUP", () => this.now(DAEMON_STOPPED));
    process.on("SIGTSTP", suspended);
  }

  now(cause: number): void {
    this.#resolve(cause);
  }

  /** A defect of ours: dark first, then the truth, then an end. */
  onDefect(dark: () => void): void {
    process.on("uncaughtException", (error) => {
      dark();
      process.stderr.write(`beamsitter found a defect of its own and went dark.\n${error.stack}\n`);
      // A serial port writes in the background: the dark must be out before the process is gone.
      setTimeout(() => process.exit(DEFECT_EXIT), WRITTEN_ms_MAX);
    });
  }

  wait(for_ms: number | null): Promise<number> {
    if (for_ms !== null) setTimeout(() => this.now(BY_PERSON), for_ms);
    return this.#ended;
  }
}
