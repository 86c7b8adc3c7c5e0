import { getHeapStatistics } from "node:v8";
import { DIGEST_START, mixOut } from "../../daemon/judge/digest.ts";
import { INPUT } from "../../daemon/judge/records.ts";
import { newOut } from "../../daemon/judge/state.ts";
import { step } from "../../daemon/judge/step.ts";
import { CHANNEL, planOf } from "../unit/judge/bench.ts";
import { Rig } from "../unit/judge/rig.ts";

/**
 * Judges samples of a lit bench whose case warms and cools, and prints one line of JSON: bytes by
 * which the heap grew, processor time a sample, and the digest of all outcomes. Run it with a young
 * generation so large that nothing is collected meanwhile, else the bytes mean nothing.
 */

/** The engine compiles what is hot only after a while, and boxes numbers until then. */
const WARM_UP = 200_000;
const MEASURED = 100_000;

const rig = new Rig(planOf()).light(1500);
const { input, plan, state } = rig;
const out = newOut();
let seed = 12_345;
let steps = 0;

function judge(samples: number): number {
  const { sample } = input;
  input.kind = INPUT.sample;
  let hash = DIGEST_START;
  for (let i = 0; i < samples; i++) {
    seed = (Math.imul(seed, 1_664_525) + 1_013_904_223) | 0;
    const noise = (seed >>> 28) - 8;
    sample.seq = (sample.seq + 1) >>> 0;
    sample.tick = (sample.tick + 20) >>> 0;
    sample.conversions = (sample.conversions + 1) & 0xffff;
    sample.values[CHANNEL.current] = (sample.values[CHANNEL.set] ?? 0) + (noise >> 2);
    sample.values[CHANNEL.case] = 2600 + ((steps++ >> 6) & 1023) + noise;
    input.n++;
    input.now_ms += 20;
    step(plan, state, input, out);
    if (out.permit === 1) sample.values[CHANNEL.set] = out.aim_counts;
    hash = mixOut(hash, out);
  }
  return hash;
}

judge(WARM_UP);
const before = getHeapStatistics().used_heap_size;
const cpu = process.cpuUsage();
const digest = judge(MEASURED);
const nsPerSample = (process.cpuUsage(cpu).user * 1000) / MEASURED;
const bytes = getHeapStatistics().used_heap_size - before;
process.stdout.write(
  `${JSON.stringify({ samples: MEASURED, bytes, nsPerSample, digest, state: state.state })}\n`,
);
