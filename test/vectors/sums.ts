import {
  type ArmTerms,
  armAnswer,
  armAnswerText,
  curveCrc,
} from "../../firmware-protocol/answer.ts";
import { crc32Text, hex32 } from "../../firmware-protocol/crc.ts";

/** CRC-32 values that both sides must make alike: arm answers, curves, manifests. */

const terms: readonly ArmTerms[] = [
  {
    number: "1A2B3C4D",
    boot: 8,
    arms: 3,
    curveCrc: "9B6D1F20",
    absolute_counts: 2200,
    term_ticks_min: 150,
    term_ticks_max: 10000,
    protocol: 1,
    firmware: "bs-atmega328p-1",
  },
  {
    number: "00000001",
    boot: 0,
    arms: 0,
    curveCrc: "00000000",
    absolute_counts: 0,
    term_ticks_min: 0,
    term_ticks_max: 0,
    protocol: 1,
    firmware: "x",
  },
  {
    number: "FFFFFFFF",
    boot: 4294967295,
    arms: 4294967295,
    curveCrc: "FFFFFFFF",
    absolute_counts: 65535,
    term_ticks_min: 65535,
    term_ticks_max: 65535,
    protocol: 255,
    firmware: "a1234567890123456789",
  },
];

const curves = [
  { x: [100, 900], y: [2000, 0] },
  { x: [0, 1, 65534, 65535], y: [65535, 65535, 1, 0] },
  { x: [210, 330, 420, 505, 600, 700], y: [2100, 2100, 1900, 1500, 700, 0] },
];

const manifests = [
  [
    "<channel 0 set mA 1e0 0 2200 0",
    "<channel 1 current mA 1e0 0 2400 0",
    "<channel 2 case adc 1e0 0 1023 0",
    "<channel 3 photodiode adc 1e0 0 1023 0",
  ],
];

export const sums: readonly Record<string, unknown>[] = [
  ...terms.map((t) => ({ of: "arm answer", text: armAnswerText(t), crc: hex32(armAnswer(t)) })),
  ...curves.map((points) => ({ of: "curve", points, crc: curveCrc(points) })),
  ...manifests.map((bodies) => ({
    of: "manifest",
    bodies,
    crc: hex32(crc32Text(bodies.map((body) => `${body}\n`).join(""))),
  })),
];
