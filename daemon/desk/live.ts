import type { WebSocket } from "ws";
import type { Snapshot, SwitchPush } from "../control/api.ts";

/** Most pages at once; each costs main nothing, but the desk a little. */
export const PAGES_MAX = 64;
/** Shortest time between two snapshots to the pages, ms: ten a second at most. */
const SNAPSHOT_ms_MIN = 100;
/** A page with more than this unread gets no snapshot until it has caught up, bytes. */
const UNREAD_BYTES_MAX = 64 * 1024;
/** Pages that left without saying so are noticed by an unanswered ping, ms. */
const PING_ms = 10_000;

/** What a page gets over `/api/live`. */
export type LivePush =
  | SwitchPush
  /** Whether the desk has its line to the judging thread. */
  | { readonly push: "line"; readonly connected: boolean };

/** The stream from the switch to every page. Keeps the newest snapshot for those who come later. */
export class Live {
  readonly #pages = new Map<WebSocket, { answered: boolean }>();
  readonly #now: () => number;
  readonly #ping: NodeJS.Timeout;
  #snapshot: Snapshot | undefined;
  #connected = false;
  #sentAt = Number.NEGATIVE_INFINITY;

  constructor(now: () => number = () => performance.now()) {
    this.#now = now;
    this.#ping = setInterval(() => this.#dropSilent(), PING_ms);
    this.#ping.unref();
  }

  /** The newest snapshot; undefined before the first and while the line is down. */
  get snapshot(): Snapshot | undefined {
    return this.#connected ? this.#snapshot : undefined;
  }

  /** The bench of the newest snapshot, also after the line went down; empty before the first. */
  get bench(): string {
    return this.#snapshot?.bench ?? "";
  }

  get pages(): number {
    return this.#pages.size;
  }

  add(page: WebSocket): void {
    if (this.#pages.size >= PAGES_MAX) {
      page.close(1013, `this desk serves ${PAGES_MAX} pages at most`);
      return;
    }
    this.#pages.set(page, { answered: true });
    page.on("pong", () => {
      const entry = this.#pages.get(page);
      if (entry !== undefined) entry.answered = true;
    });
    page.on("close", () => this.#pages.delete(page));
    page.on("error", () => page.terminate());
    this.#send(page, { push: "line", connected: this.#connected });
    if (this.snapshot !== undefined)
      this.#send(page, { push: "snapshot", snapshot: this.snapshot });
  }

  /** A snapshot or an event from the switch. A change of state is never held back. */
  take(push: SwitchPush): void {
    if (push.push === "event") {
      this.#toAll(push);
      return;
    }
    const changed = push.snapshot.state !== this.#snapshot?.state;
    this.#snapshot = push.snapshot;
    const now = this.#now();
    if (!changed && now - this.#sentAt < SNAPSHOT_ms_MIN - 1) return;
    this.#sentAt = now;
    this.#toAll(push);
  }

  line(connected: boolean): void {
    if (connected === this.#connected) return;
    this.#connected = connected;
    if (!connected) this.#sentAt = Number.NEGATIVE_INFINITY;
    this.#toAll({ push: "line", connected });
  }

  close(): void {
    clearInterval(this.#ping);
    for (const page of this.#pages.keys()) page.terminate();
  }

  #toAll(push: LivePush): void {
    const text = JSON.stringify(push);
    for (const page of this.#pages.keys()) {
      if (push.push === "snapshot" && page.bufferedAmount > UNREAD_BYTES_MAX) continue;
      page.send(text);
    }
  }

  #send(page: WebSocket, push: LivePush): void {
    page.send(JSON.stringify(push));
  }

  #dropSilent(): void {
    for (const [page, entry] of this.#pages) {
      if (!entry.answered) page.terminate();
      entry.answered = false;
      page.ping();
    }
  }
}
