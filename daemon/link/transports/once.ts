import type { TransportHandlers } from "./transport.ts";

/**
 * Where a connection stands, so that each handler is called when it may be and no more: `opened`
 * once, `closed` once, nothing after either end.
 */
export class Once {
  private handlers: TransportHandlers | null = null;
  isOpen = false;
  private ended = false;

  begin(handlers: TransportHandlers): void {
    if (this.handlers !== null || this.ended) {
      throw new Error("a transport is opened once; make a new one for a new connection");
    }
    this.handlers = handlers;
  }

  get isEnded(): boolean {
    return this.ended;
  }

  opened(): void {
    if (this.ended || this.isOpen) return;
    this.isOpen = true;
    this.handlers?.opened();
  }

  line(line: string): void {
    if (!this.ended) this.handlers?.line(line);
  }

  /** The connection ended by itself. */
  closed(why: string): void {
    const { handlers } = this;
    if (this.end()) handlers?.closed(why);
  }

  /** Whether this call ended it. */
  end(): boolean {
    if (this.ended) return false;
    this.ended = true;
    this.isOpen = false;
    return true;
  }
}
