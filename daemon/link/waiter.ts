/**
 * A wait for the answer to one line. It is armed before the line is written; its clock starts at
 * the first moment that the session is told afterwards, so that an order given between two moments
 * is not charged for the time before it.
 */
export class Waiter {
  /** Verb of the line that waits for an answer; empty while none does. */
  verb = "";
  private within_ms = 0;
  private deadline = Number.NaN;

  begin(verb: string, within_ms: number): void {
    this.verb = verb;
    this.within_ms = within_ms;
    this.deadline = Number.NaN;
  }

  end(): void {
    this.verb = "";
  }

  get waiting(): boolean {
    return this.verb !== "";
  }

  /** Whether the wait is over without an answer. Starts its clock on the first call. */
  expired(now: number): boolean {
    if (this.verb === "") return false;
    if (Number.isNaN(this.deadline)) this.deadline = now + this.within_ms;
    return now >= this.deadline;
  }

  /** When `expired` can turn true; −Infinity while its clock has not started. */
  next(): number {
    if (this.verb === "") return Number.POSITIVE_INFINITY;
    return Number.isNaN(this.deadline) ? Number.NEGATIVE_INFINITY : this.deadline;
  }
}
