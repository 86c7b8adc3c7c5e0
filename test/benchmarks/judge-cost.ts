import { readFileSync } from "node:fs";
import { setFlagsFromString } from "node:v8";
import { runInNewContext } from "node:vm";
import { makeCurve } from "../../daemon/bench-file/curve.ts";
import { parseBench } from "../../daemon/bench-file/parse.ts";
import { compilePlan, type Plan } from "../../daemon/judge/plan.ts";
import { INPUT, type Input, type Out, REQUEST } from "../../daemon/judge/records.ts";
import { newInput, newOut, newState, type State } from "../../daemon/judge/state.ts";
import { step } from "../../daemon/judge/step.ts";
import { linkFactCode } from "../../daemon/model/link-fact.ts";
import type { Manifest } from "../../daemon/model/manifest.ts";
import { STATUS } from "../../daemon/model/sample.ts";
import { assetFile } from "../../daemon/paths.ts";
import { type Figure, median } from "./figure.ts";

const SAMPLES = 200_000;
const RUNS = 7;
const PERIOD_ms = 20;

/** What the judge costs for each sample of an emitting bench: time, and heap that stays. */
export function judgeCost(): Figure[] {
  setFlagsFromString("--expose-gc");
  const collect = runInNewContext("gc") as () => void;
  const bench = new EmittingBench();
  bench.run(SAMPLES);
  const nanoseconds: number[] = [];
  for (let i = 0; i < RUNS; i++) {
    const began = process.hrtime.bigint();
    bench.run(SAMPLES);
    nanoseconds.push(Number(process.hrtime.bigint() - began) / SAMPLES);
  }
  collect();
  const before = process.memoryUsage().heapUsed;
  bench.run(SAMPLES);
  // Without a collection in between, everything that was allocated is still counted.
  const after = process.memoryUsage().heapUsed;
  if (!bench.emits) throw new Error("the bench of the measurement went dark");
  return [
    { name: "judge.nsPerSample", value: median(nanoseconds), unit: "ns" },
    { name: "judge.bytesPerSample", value: Math.max(0, after - before) / SAMPLES, unit: "byte" },
  ];
}

/** Bench north at 1.2 A with readings that stand still but for a little noise. */
class EmittingBench {
  readonly #plan: Plan;
  readonly #state: State = newState();
  readonly #input: Input = newInput();
  readonly #out: Out = newOut();
  #n = 0;
  #now_ms = 0;
  #conversions = 0;

  constructor() {
    const text = readFileSync(assetFile("daemon/bench-file/benches/north.yaml"), "utf8");
    const parsed = parseBench(text);
    if (!parsed.ok) throw new Error("north.yaml is damaged");
    const curve = makeCurve(parsed.bench, NORTH);
    if ("problems" in curve) throw new Error(curve.problems.join(" "));
    const compiled = compilePlan(parsed.bench, NORTH, curve);
    if (!compiled.ok) throw new Error(compiled.problems.join(" "));
    this.#plan = compiled.plan;
    this.#fact("introduced");
    for (let i = 0; i < 100; i++) this.#sample(0, STANDBY);
    this.#begin(INPUT.request);
    this.#input.request = REQUEST.arm;
    this.#input.value = 1200;
    this.#judge();
    this.#fact("armed");
    for (let i = 0; i < 2000; i++) this.#sample(this.#out.aim_counts, LIT);
  }

  get emits(): boolean {
    return this.#out.view.state === 3;
  }

  run(samples: number): void {
    for (let i = 0; i < samples; i++) this.#sample(2400, LIT);
  }

  #fact(name: "introduced" | "armed"): void {
    this.#begin(INPUT.link);
    this.#input.fact = linkFactCode(name);
    this.#judge();
  }

  #sample(set_counts: number, status: number): void {
    this.#now_ms += PERIOD_ms;
    this.#begin(INPUT.sample);
    const { sample } = this.#input;
    sample.seq = (sample.seq + 1) >>> 0;
    sample.tick = (sample.tick + PERIOD_ms) >>> 0;
    sample.status = status | (set_counts > 0 ? STATUS.emitting : 0);
    sample.conversions = this.#conversions = (this.#conversions + 20) & 0xffff;
    const noise = (sample.seq * 7) % 3;
    sample.values[0] = set_counts;
    sample.values[1] = Math.round(set_counts * 3.125) + noise;
    sample.values[2] = 8192 + noise;
    // What north gives at 1.2 A and 25 °C, near enough for every output row.
    sample.values[3] = set_counts > 0 ? this.#expectedCounts() : 0;
    this.#judge();
  }

  #expectedCounts(): number {
    const { expected_mW } = this.#out.view;
    return Number.isFinite(expected_mW) ? Math.round(expected_mW / 0.05) : 0;
  }

  #begin(kind: number): void {
    this.#input.n = ++this.#n;
    this.#input.kind = kind;
    this.#input.now_ms = this.#now_ms;
    this.#input.newest = 1;
    this.#input.portDrained = 1;
  }

  #judge(): void {
    step(this.#plan, this.#state, this.#input, this.#out);
  }
}

const STANDBY = STATUS.key | STATUS.loop | STATUS.fan | STATUS.anchor | STATUS.curve;
const LIT = STANDBY | STATUS.armed | STATUS.indicator;

const channel = (index: number, name: string, unit: string, perCount: number) => ({
  index,
  name,
  unit,
  perCount,
  count_min: 0,
  count_max: 16383,
  group: 0,
});

const NORTH: Manifest = {
  id: "00000000",
  protocol: 1,
  firmware: "bs-north-1",
  serial: "NORTH-1",
  boot: 1,
  tick_us: 1000,
  absolute_counts: 4400,
  curveCrc: "00000000",
  term_ticks_min: 150,
  term_ticks_max: 10000,
  fall_ms: 20,
  rate_perS: 50,
  capabilities: [],
  channels: [
    { ...channel(0, "set", "mA", 0.5), count_max: 5000 },
    channel(1, "current", "mA", 0.16),
    channel(2, "case", "adc", 1),
    channel(3, "photodiode", "adc", 1),
  ],
};
