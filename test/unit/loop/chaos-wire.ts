import type { Chance } from "../../../daemon/bench-sim/chance.ts";

/** What a wire can do to the bytes put on it. */
export const WIRE_FAULTS = [
  "clean",
  "loses",
  "garbles",
  "doubles",
  "reorders",
  "delays",
  "sticks",
  "replays",
  "noisy",
] as const;
export type WireFault = (typeof WIRE_FAULTS)[number];

interface Message {
  readonly due_ms: number;
  readonly bytes: Uint8Array;
}

const KEPT = 64;
const LATENCY_ms_MAX = 900;

/** One direction of a serial wire. A message is what one side wrote in one go. */
export class Wire {
  fault: WireFault = "clean";
  readonly #chance: Chance;
  #queue: Message[] = [];
  #held: Uint8Array | null = null;
  #old: Uint8Array[] = [];
  #latest_ms = 0;
  #latency_ms = 0;

  constructor(chance: Chance) {
    this.#chance = chance;
  }

  /** Whether all that was written has left this side. */
  get isDrained(): boolean {
    return this.fault !== "sticks" || this.#queue.length === 0;
  }

  /** Changes what the wire does; what is stuck comes out at once. */
  become(fault: WireFault): void {
    this.fault = fault;
    this.#latency_ms = fault === "delays" ? this.#chance.uniform() * LATENCY_ms_MAX : 0;
    if (fault !== "reorders" && this.#held !== null) {
      this.#push(this.#held, 0);
      this.#held = null;
    }
  }

  /** Forgets what is on its way: the cable is out. */
  cut(): void {
    this.#queue = [];
    this.#held = null;
  }

  put(bytes: Uint8Array, now_ms: number): void {
    this.#old.push(bytes);
    if (this.#old.length > KEPT) this.#old.shift();
    const chance = this.#chance.uniform();
    switch (this.fault) {
      case "loses":
        this.#push(chance < 0.3 ? NOTHING : this.#thin(bytes), now_ms);
        break;
      case "garbles":
        this.#push(chance < 0.6 ? this.#garbled(bytes) : bytes, now_ms);
        break;
      case "doubles":
        this.#push(bytes, now_ms);
        if (chance < 0.6) this.#push(bytes, now_ms);
        break;
      case "reorders":
        this.#reorder(bytes, chance, now_ms);
        break;
      case "replays":
        this.#push(bytes, now_ms);
        if (chance < 0.4) this.#push(this.#old[this.#upTo(this.#old.length)] ?? NOTHING, now_ms);
        break;
      case "noisy":
        if (chance < 0.3) this.#push(this.#noise(), now_ms);
        this.#push(bytes, now_ms);
        break;
      default:
        this.#push(bytes, now_ms);
    }
  }

  /** What arrives by now. */
  take(now_ms: number): Uint8Array[] {
    if (this.fault === "sticks") return [];
    const due: Uint8Array[] = [];
    while ((this.#queue[0]?.due_ms ?? Number.POSITIVE_INFINITY) <= now_ms) {
      const first = this.#queue.shift();
      if (first !== undefined && first.bytes.length > 0) due.push(first.bytes);
    }
    return due;
  }

  #push(bytes: Uint8Array, now_ms: number): void {
    this.#latest_ms = Math.max(this.#latest_ms, now_ms + this.#latency_ms);
    this.#queue.push({ due_ms: this.#latest_ms, bytes });
  }

  #reorder(bytes: Uint8Array, chance: number, now_ms: number): void {
    if (this.#held === null && chance < 0.5) {
      this.#held = bytes;
      return;
    }
    this.#push(bytes, now_ms);
    if (this.#held !== null) this.#push(this.#held, now_ms);
    this.#held = null;
  }

  #upTo(n: number): number {
    return Math.floor(this.#chance.uniform() * n);
  }

  /** Some bytes fall out. */
  #thin(bytes: Uint8Array): Uint8Array {
    return bytes.filter(() => this.#chance.uniform() >= 0.01);
  }

  /** A burst of up to 16 bits, or a digit that became another digit. */
  #garbled(bytes: Uint8Array): Uint8Array {
    const made = bytes.slice();
    const at = this.#upTo(made.length);
    const byte = made[at] ?? 0;
    if (this.#chance.uniform() < 0.5) made[at] = 0x30 + this.#upTo(10);
    else made[at] = byte ^ (1 + this.#upTo(255));
    if (this.#chance.uniform() < 0.3 && at + 1 < made.length) {
      made[at + 1] = (made[at + 1] ?? 0) ^ this.#upTo(256);
    }
    return made;
  }

  /** What an open input picks up; now and then it is what cuts, or looks like a line's beginning. */
  #noise(): Uint8Array {
    const pick = this.#chance.uniform();
    if (pick < 0.02) return Uint8Array.of(0x18, 0x18, 0x18);
    if (pick < 0.04) return new TextEncoder().encode("\ndark\n");
    const made = new Uint8Array(this.#upTo(pick < 0.1 ? 400 : 12));
    for (let i = 0; i < made.length; i++) made[i] = this.#upTo(256);
    return made;
  }
}

const NOTHING = new Uint8Array(0);
