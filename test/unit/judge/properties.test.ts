import fc from "fast-check";
import { describe, expect, test } from "vitest";
import { DIGEST_START, mixOut } from "../../../daemon/judge/digest.ts";
import {
  INPUT,
  type Input,
  type Out,
  REQUEST,
  REQUESTS,
  STATE,
} from "../../../daemon/judge/records.ts";
import {
  newInput,
  newOut,
  newState,
  packState,
  STATE_LENGTH,
  type State,
  unpackState,
} from "../../../daemon/judge/state.ts";
import { step } from "../../../daemon/judge/step.ts";
import { EVENT_KINDS } from "../../../daemon/model/event.ts";
import { LINK_FACTS, linkFactCode } from "../../../daemon/model/link-fact.ts";
import { STATUS } from "../../../daemon/model/sample.ts";
import { CHANNEL, planOf } from "./bench.ts";

const SEED = 20_261_201;
const RUNS = 120;
const plan = planOf();

/** One input of a wild world: lines, people and time in any order, boards that say anything. */
type Wild =
  | { kind: "sample"; status: number; cause: number; values: number[]; ticks: number; gate: number }
  | { kind: "request"; request: number; asker: number; value: number }
  | { kind: "fact"; fact: number; value: number }
  | { kind: "deadline"; ms: number };

const GOOD = STATUS.key | STATUS.loop | STATUS.curve | STATUS.anchor | STATUS.fan;
const status = fc.oneof(
  { weight: 6, arbitrary: fc.constantFrom(GOOD, GOOD | STATUS.armed) },
  { weight: 3, arbitrary: fc.constant(GOOD | STATUS.armed | STATUS.emitting) },
  { weight: 1, arbitrary: fc.constant(GOOD | STATUS.tripped) },
  { weight: 1, arbitrary: fc.integer({ min: 0, max: 0xffff }) },
);
const values = fc.oneof(
  {
    weight: 6,
    arbitrary: fc.tuple(
      fc.integer({ min: 0, max: 3700 }),
      fc.integer({ min: 0, max: 3700 }),
      fc.integer({ min: 2000, max: 5200 }),
      fc.integer({ min: 0, max: 20_000 }),
    ),
  },
  {
    weight: 4,
    arbitrary: fc.constantFrom([0, 0, 2500, 0], [0, 0, 4000, 0], [2000, 2000, 2500, 6000]),
  },
  { weight: 1, arbitrary: fc.array(fc.integer(), { minLength: 4, maxLength: 4 }) },
);
const sample = fc.record({
  kind: fc.constant("sample" as const),
  status,
  cause: fc.constantFrom(0, 1, 2, 16, 64, 74, 255),
  values: values.map((v) => [...v]),
  ticks: fc.oneof(
    { weight: 12, arbitrary: fc.constant(20) },
    { weight: 1, arbitrary: fc.integer({ min: -2000, max: 5000 }) },
  ),
  gate: fc.constantFrom(3, 3, 3, 0, 1, 2),
});
const request = fc.record({
  kind: fc.constant("request" as const),
  request: fc.oneof(
    { weight: 4, arbitrary: fc.constantFrom(REQUEST.arm, REQUEST.set, REQUEST.reset) },
    { weight: 1, arbitrary: fc.integer({ min: 0, max: REQUESTS.length }) },
  ),
  asker: fc.integer({ min: 0, max: 4 }),
  value: fc.constantFrom(0, 500, 1500, 1880, 5000, -1, Number.NaN, 2, 74, 81, 83),
});
const fact = fc.record({
  kind: fc.constant("fact" as const),
  fact: fc.oneof(
    { weight: 6, arbitrary: fc.constantFrom(linkFactCode("introduced"), linkFactCode("armed")) },
    { weight: 1, arbitrary: fc.integer({ min: 0, max: LINK_FACTS.length }) },
  ),
  value: fc.nat(3),
});
const deadline = fc.record({
  kind: fc.constant("deadline" as const),
  ms: fc.integer({ min: 0, max: 4000 }),
});
const wild = fc.oneof(
  { weight: 24, arbitrary: sample },
  { weight: 4, arbitrary: request },
  { weight: 4, arbitrary: fact },
  { weight: 1, arbitrary: deadline },
);
/** A night that begins well, so that the wild part meets light too. */
const night = fc.array(wild, { minLength: 20, maxLength: 250 }).map((rest) => [...DAWN, ...rest]);
const quiet = (armed: boolean): Wild => ({
  kind: "sample",
  status: armed ? GOOD | STATUS.armed : GOOD,
  cause: 0,
  values: [0, 0, 2500, 0],
  ticks: 20,
  gate: 3,
});
const DAWN: Wild[] = [
  { kind: "fact", fact: linkFactCode("introduced"), value: 1 },
  quiet(false),
  { kind: "request", request: REQUEST.arm, asker: 0, value: 1500 },
  { kind: "fact", fact: linkFactCode("armed"), value: 0 },
  quiet(true),
  quiet(true),
];

function fill(input: Input, one: Wild): void {
  input.n++;
  Object.assign(input, { request: 0, asker: 0, requestId: 0, value: 0, fact: 0, factValue: 0 });
  switch (one.kind) {
    case "sample": {
      const { sample } = input;
      input.kind = INPUT.sample;
      input.now_ms += Math.max(1, one.ticks);
      sample.seq = (sample.seq + (one.ticks === 0 ? 0 : 1)) >>> 0;
      sample.tick = (sample.tick + one.ticks) >>> 0;
      sample.conversions = (sample.conversions + 1) & 0xffff;
      sample.status = one.status;
      sample.cause = one.cause;
      for (const [i, value] of one.values.entries()) sample.values[i] = value;
      input.newest = one.gate & 1;
      input.portDrained = one.gate >> 1;
      return;
    }
    case "request":
      input.kind = INPUT.request;
      input.request = one.request;
      input.asker = one.asker;
      input.requestId = input.n;
      input.value = one.value;
      return;
    case "fact":
      input.kind = INPUT.link;
      input.fact = one.fact;
      input.factValue = one.value;
      return;
    case "deadline":
      input.kind = INPUT.deadline;
      input.now_ms += one.ms;
  }
}

function run(
  night: readonly Wild[],
  check: (input: Input, state: State, out: Out) => void,
): number {
  const input = newInput();
  const state = newState();
  const out = newOut();
  let hash = DIGEST_START;
  for (const one of night) {
    fill(input, one);
    step(plan, state, input, out);
    check(input, state, out);
    hash = mixOut(hash, out);
  }
  return hash;
}

const kindsOf = (out: Out): string[] =>
  Array.from(out.eventKind.subarray(0, out.eventCount), (kind) => EVENT_KINDS[kind] ?? "?");

describe(`whatever comes in (seed ${SEED}, ${RUNS} nights)`, () => {
  test("a permit needs an open session, a fresh judged sample, and stays under every ceiling", () => {
    let permits = 0;
    const check = (input: Input, _state: State, out: Out): void => {
      expect(out.permit === 0 || out.permit === 1).toBe(true);
      if (out.permit === 0) return;
      permits++;
      expect(input.kind).toBe(INPUT.sample);
      expect([STATE.armed, STATE.emitting]).toContain(out.view.state);
      expect(input.sample.status & (STATUS.armed | STATUS.emitting)).not.toBe(0);
      expect(input.sample.status & STATUS.tripped).toBe(0);
      expect(input.sample.status & STATUS.key).not.toBe(0);
      expect(input.sample.status & STATUS.anchor).not.toBe(0);
      expect(out.dark).toBe(-1);
      expect(out.permitSeq).toBe(input.sample.seq);
      expect(input.newest & input.portDrained).toBe(1);
      expect(out.aim_counts).toBeLessThanOrEqual(out.cap_counts);
      expect(out.cap_counts).toBeLessThanOrEqual(plan.absolute_counts);
      const case_counts = input.sample.values[CHANNEL.case] ?? -1;
      const ceiling_mA = plan.case.ceiling_mA[case_counts] ?? 0;
      expect(out.cap_counts * 0.5).toBeLessThanOrEqual(ceiling_mA + 1e-6);
      expect(out.term_ticks).toBe(500);
    };
    fc.assert(
      fc.property(night, (n) => void run(n, check)),
      { seed: SEED, numRuns: RUNS },
    );
    expect(permits).toBeGreaterThan(RUNS);
  });

  test("after whatever ended it, no permit until armed anew; after a trip, until reset as well", () => {
    let relit = 0;
    const property = (n: Wild[]): void => {
      let mayLight = false;
      let latched = false;
      run(n, (input, _state, out) => {
        const kinds = kindsOf(out);
        if (kinds.includes("trip")) {
          expect(latched, "one first-out between two resets").toBe(false);
          latched = true;
        }
        if (kinds.includes("reset")) {
          expect(latched).toBe(true);
          latched = false;
        }
        if (out.dark >= 0 || kinds.includes("trip") || kinds.includes("dark")) mayLight = false;
        const armedNow = input.kind === INPUT.link && input.fact === linkFactCode("armed");
        if (armedNow && out.view.state === STATE.armed) {
          expect(latched).toBe(false);
          if (!mayLight) relit++;
          mayLight = true;
        }
        expect(latched).toBe(out.view.state === STATE.tripped);
        if (out.permit === 1) expect(mayLight && !latched).toBe(true);
      });
    };
    fc.assert(fc.property(night, property), { seed: SEED + 1, numRuns: RUNS });
    expect(relit).toBeGreaterThan(RUNS / 2);
  });

  test("every request is answered in the step that brings it, and dark always done", () => {
    const check = (input: Input, _state: State, out: Out): void => {
      if (input.kind !== INPUT.request) return;
      expect(out.answer).not.toBe(0);
      expect(out.answerId).toBe(input.requestId);
      if (input.request === REQUEST.dark) {
        expect(out.dark).toBeGreaterThanOrEqual(0);
        expect(out.answer).toBe(1);
        expect([STATE.armed, STATE.emitting]).not.toContain(out.view.state);
      }
    };
    fc.assert(
      fc.property(night, (n) => void run(n, check)),
      { seed: SEED + 2, numRuns: RUNS },
    );
  });

  test("the next deadline is in the future, or never, and never not a number", () => {
    const check = (input: Input, _state: State, out: Out): void => {
      expect(out.deadline_ms).toBeGreaterThan(input.now_ms);
    };
    fc.assert(
      fc.property(night, (n) => void run(n, check)),
      { seed: SEED + 3, numRuns: RUNS },
    );
  });
});

describe(`the same inputs give the same outcomes (seed ${SEED})`, () => {
  test("twice", () => {
    const property = (n: Wild[]): void => {
      expect(run(n, () => {})).toBe(run(n, () => {}));
    };
    fc.assert(fc.property(night, property), { seed: SEED + 4, numRuns: RUNS });
  });

  test("and when the state is packed and unpacked after every step", () => {
    const cells = new Float64Array(STATE_LENGTH);
    const property = (n: Wild[]): void => {
      const input = newInput();
      const out = newOut();
      let state = newState();
      let hash = DIGEST_START;
      for (const one of n) {
        fill(input, one);
        step(plan, state, input, out);
        hash = mixOut(hash, out);
        packState(state, cells);
        const unpacked = unpackState(cells);
        expect(unpacked).not.toBeNull();
        state = unpacked ?? newState();
      }
      expect(hash).toBe(run(n, () => {}));
    };
    fc.assert(fc.property(night, property), { seed: SEED + 5, numRuns: 100 });
  });

  test("the digest tells a different outcome apart", () => {
    const base = newOut();
    const other = newOut();
    other.view.case_degC = 25;
    const more = newOut();
    more.permit = 1;
    const hashes = [base, other, more].map((out) => mixOut(DIGEST_START, out));
    expect(new Set(hashes).size).toBe(3);
  });

  test("a state of another version is not read", () => {
    const cells = new Float64Array(STATE_LENGTH);
    packState(newState(), cells);
    cells[0] = 0;
    expect(unpackState(cells)).toBeNull();
    expect(unpackState(new Float64Array(3))).toBeNull();
  });
});
