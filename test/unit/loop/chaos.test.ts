import { describe, expect, test } from "vitest";
import { STATE } from "../../../daemon/judge/records.ts";
import { wall } from "../../../daemon/model/times.ts";
import { Chaos } from "./chaos.ts";

/** More seeds than the suite has time for: CHAOS_FROM=1000 CHAOS_SEEDS=200 runs that many. */
const FROM = Number(process.env.CHAOS_FROM ?? 1);
const SEEDS = Number(process.env.CHAOS_SEEDS ?? 3);
const RUN_ms = 45_000;
const SETTLE_ms = 4000;
const LIMIT_ms = 60_000 + SEEDS * 30_000;

describe("everything goes wrong at random, and the diode is looked at in every millisecond", () => {
  const last = FROM + SEEDS - 1;

  test(
    `seeds ${FROM} to ${last}: light only within a permit, under both roofs, latched until reset and armed`,
    () => {
      const wrong: string[] = [];
      const seen = { permits: 0, lit_ms: 0, sessions: 0, trips: new Set<string>() };
      for (let seed = FROM; seed <= last; seed++) {
        const c = new Chaos(seed);
        c.run(RUN_ms);
        c.settle(SETTLE_ms);
        const { oracle } = c;
        wrong.push(...oracle.violations.map((words) => `seed ${seed}, ${words}`));
        // Once all is well again, both sides agree on whether the bench is latched.
        if (oracle.boardTripped && c.state !== "tripped") {
          wrong.push(`seed ${seed}, at the end the board is tripped and the host ${c.state}`);
        }
        if (c.state === "offline") wrong.push(`seed ${seed}, at the end the host is offline`);
        seen.permits += oracle.permits;
        seen.lit_ms += oracle.lit_ms;
        seen.sessions += oracle.sessions;
        for (const trip of oracle.trips) seen.trips.add(trip);
      }
      expect(wrong).toEqual([]);
      // They were no idle nights: light came, went, and came again.
      expect(seen.permits).toBeGreaterThan(200 * SEEDS);
      expect(seen.lit_ms).toBeGreaterThan((RUN_ms / 10) * SEEDS);
      expect(seen.sessions).toBeGreaterThan(2 * SEEDS);
      expect(seen.trips.size).toBeGreaterThan(3);
    },
    LIMIT_ms,
  );
});

/** Permits sent from a timer, on a sample that was judged some time ago. */
class FromTimer extends Chaos {
  #last = "";

  override write(line: string): boolean {
    if (line.startsWith(">permit ")) this.#last = line;
    return super.write(line);
  }

  protected override sabotage(): void {
    if (this.now_ms % 90 === 0 && this.#last !== "") super.write(this.#last);
  }
}

/** Every permit is sent twice, in case one is lost. */
class Twice extends Chaos {
  override write(line: string): boolean {
    if (line.startsWith(">permit ")) super.write(line);
    return super.write(line);
  }
}

/** An output stage that stays on for a while after it was cut. */
class SlowStage extends Chaos {
  constructor(seed: number) {
    super(seed);
    const { controller } = this.board;
    const own = Object.getPrototypeOf(controller) as object;
    const read = (name: string): unknown =>
      Object.getOwnPropertyDescriptor(own, name)?.get?.call(controller);
    let on_ms = Number.NEGATIVE_INFINITY;
    let counts: unknown = 0;
    const isOn = (): boolean => this.now_ms - on_ms < 40;
    Object.defineProperty(controller, "enabled", {
      get: () => {
        if (read("enabled") === true) {
          on_ms = this.now_ms;
          counts = read("drive_counts");
        }
        return isOn();
      },
    });
    Object.defineProperty(controller, "drive_counts", {
      get: () => (isOn() ? counts : read("drive_counts")),
    });
  }
}

/** A judge that forgets what it tripped on. */
class Forgets extends Chaos {
  protected override sabotage(): void {
    const { state } = this.loop;
    if (state.state === STATE.tripped && this.now_ms % 50 === 0) state.state = STATE.standby;
  }
}

/** A judge whose ceiling stands a tenth too high. */
class TooHigh extends Chaos {
  #raised: object | null = null;

  protected override sabotage(): void {
    const { plan } = this.loop;
    if (plan === null || plan === this.#raised) return;
    this.#raised = plan;
    const { ceiling_mA, cap_counts } = plan.case;
    for (let i = 0; i < cap_counts.length; i++) {
      ceiling_mA[i] = (ceiling_mA[i] ?? 0) * 1.1;
      cap_counts[i] = Math.floor((cap_counts[i] ?? 0) * 1.1);
    }
  }
}

describe("a canary is caught", () => {
  test.each([
    ["permits from a timer", FromTimer, /outside of judging/],
    ["a permit sent twice", Twice, /two permits for one sample/],
    ["a stage that stays on", SlowStage, /without a live permit/],
    ["a judge that forgets its latch", Forgets, /latched by .*, yet standby/],
    ["a ceiling that is too high", TooHigh, /the cap is above/],
  ] as const)(
    "%s",
    (_what, Canary, words) => {
      const c = new Canary(5);
      for (let s = 0; s < 40 && c.oracle.violations.length === 0; s++) c.run(1000);
      expect(c.oracle.violations.join("\n")).toMatch(words);
    },
    LIMIT_ms,
  );
});

test("a host started anew without its cable shows at once what was latched", () => {
  const c = new Chaos(1);
  c.restoreFrom({ cause: 83, wall: wall(0), serial: "NORTH-1", lit: false });
  expect([c.state, c.cause]).toEqual(["tripped", "link-lost"]);
});
