import { crc32Text, hex32 } from "../../../firmware-protocol/crc.ts";
import { seal } from "../../../firmware-protocol/line.ts";

/** Bodies of an introduction's channel lines: four judged channels and two slower ones. */
export const CHANNEL_BODIES: readonly string[] = [
  "<channel 0 set mA 1e0 0 2200 0",
  "<channel 1 current mA 1e0 -50 2400 0",
  "<channel 2 case adc 1e0 0 1023 0",
  "<channel 3 photodiode adc 1e0 0 1023 0",
  "<channel 4 sink adc 1e0 0 1023 1",
  "<channel 5 supply mV 25e0 0 1023 1",
];

/** `hello` fields, to be changed one at a time. */
export const HELLO = {
  proto: "1",
  firmware: "bs-test-1",
  serial: "BS-0001",
  boot: "7",
  tick_us: "1000",
  absolute: "2200",
  curve: "00000000",
  termMin: "150",
  termMax: "10000",
  fall_ms: "3",
  rate: "50",
  caps: "hand,toggle",
};

/** A whole introduction, closed lines without their ends. */
export const introductionOf = (
  changes: Partial<typeof HELLO> = {},
  bodies: readonly string[] = CHANNEL_BODIES,
): string[] => {
  const hello = Object.values({ ...HELLO, ...changes }).join(" ");
  const sum = hex32(crc32Text(bodies.map((body) => `${body}\n`).join("")));
  return [
    seal(`<hello ${hello} ${bodies.length}`),
    ...bodies.map(seal),
    seal(`<end ${bodies.length} ${sum}`),
  ];
};

export const INTRODUCTION: readonly string[] = introductionOf();
