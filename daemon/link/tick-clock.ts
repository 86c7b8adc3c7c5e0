/** Length of a window of which the sample with the least delay is kept, ms of the board's clock. */
export const WINDOW_ms = 1000;
/** Windows that the line is fitted to. */
const WINDOWS = 16;
/** Fewer windows tell no drift: jitter of a few milliseconds would look like one. */
const WINDOWS_MIN = 4;
/** A sample this much earlier than the line allows means that the board's clock jumped ahead. */
export const JUMP_ms = 20;
const PAIRS = (WINDOWS * (WINDOWS - 1)) / 2;

/**
 * Maps the board's ticks to the host's monotonic clock. A line can be late but never early, so of
 * each second only the sample with the least delay counts; through those runs a line by the median
 * of all slopes between two of them (Theil and Sen), which a few seconds of stalled reading do not
 * bend. Allocates nothing per sample; the fit runs once a window.
 */
export class TickClock {
  /** Rate of the board's clock over the host's, less 1: 0.01 runs 1 % fast. 0 until known. */
  drift = 0;
  /** How much earlier than possible the last sample came, ms; 0 for no jump. Told once a jump. */
  jump_ms = 0;
  /** How much later than the least delay the last sample came, ms. */
  delay_ms = 0;
  private tick_ms = 1;
  private readonly board = new Float64Array(WINDOWS);
  private readonly offset = new Float64Array(WINDOWS);
  private readonly slopes = new Float64Array(PAIRS);
  private windows = 0;
  private started = false;
  private settled = false;
  private window_ms = 0;
  private best_ms = 0;
  private bestOffset = 0;
  private slope = 0;
  private level = 0;

  /** Starts anew for a board with this tick, microseconds. */
  clear(tick_us: number): void {
    this.tick_ms = tick_us / 1000;
    this.drift = 0;
    this.jump_ms = 0;
    this.delay_ms = 0;
    this.started = false;
    this.restart();
  }

  /** @param ticks unwrapped ticks of the sample; @param received_ms when its line was read */
  sample(ticks: number, received_ms: number): void {
    const board_ms = ticks * this.tick_ms;
    const offset = received_ms - board_ms;
    this.jump_ms = 0;
    if (!this.started) this.begin(board_ms, offset);
    if (board_ms - this.window_ms >= WINDOW_ms) this.closeWindow(board_ms, offset);
    const late = offset - this.predicted(board_ms);
    if (this.settled && late < -JUMP_ms) {
      this.jump_ms = -late;
      this.restart();
      this.begin(board_ms, offset);
      this.settled = true;
    }
    if (offset <= this.bestOffset) {
      this.bestOffset = offset;
      this.best_ms = board_ms;
    }
    if (this.windows < WINDOWS_MIN) this.level = Math.min(this.level, offset);
    this.delay_ms = Math.max(0, offset - this.predicted(board_ms));
  }

  /** Host time at which a sample of that tick would have been read with the least delay, ms. */
  hostTime_ms(ticks: number): number {
    const board_ms = ticks * this.tick_ms;
    return board_ms + this.predicted(board_ms);
  }

  private predicted(board_ms: number): number {
    return this.level + this.slope * board_ms;
  }

  private restart(): void {
    this.windows = 0;
    this.slope = 0;
    this.settled = false;
  }

  private begin(board_ms: number, offset: number): void {
    this.started = true;
    this.window_ms = board_ms;
    this.best_ms = board_ms;
    this.bestOffset = offset;
    this.level = offset;
  }

  /** Keeps the least delay of the window that ended, and fits again. */
  private closeWindow(board_ms: number, offset: number): void {
    const slot = this.windows % WINDOWS;
    this.board[slot] = this.best_ms;
    this.offset[slot] = this.bestOffset;
    this.windows += 1;
    this.settled = true;
    this.window_ms = board_ms;
    this.best_ms = board_ms;
    this.bestOffset = offset;
    if (this.windows >= WINDOWS_MIN) this.fit();
  }

  private fit(): void {
    const n = Math.min(this.windows, WINDOWS);
    let pairs = 0;
    for (let i = 1; i < n; i += 1) {
      for (let j = 0; j < i; j += 1) {
        const run = (this.board[i] ?? 0) - (this.board[j] ?? 0);
        const rise = (this.offset[i] ?? 0) - (this.offset[j] ?? 0);
        this.slopes[pairs] = run === 0 ? 0 : rise / run;
        pairs += 1;
      }
    }
    // Unused places sort behind every slope.
    this.slopes.fill(Number.POSITIVE_INFINITY, pairs);
    this.slopes.sort();
    const middle = pairs >> 1;
    const high = this.slopes[middle] ?? 0;
    this.slope = pairs % 2 === 1 ? high : (high + (this.slopes[middle - 1] ?? 0)) / 2;
    this.level = Number.POSITIVE_INFINITY;
    for (let i = 0; i < n; i += 1) {
      const level = (this.offset[i] ?? 0) - this.slope * (this.board[i] ?? 0);
      if (level < this.level) this.level = level;
    }
    this.drift = 1 / (1 + this.slope) - 1;
  }
}
