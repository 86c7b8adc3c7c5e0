import { simulateNight } from "../../daemon/cli/demo-night.ts";
import type { Figure } from "./figure.ts";

/** How many simulated hours pass in a minute of the wall clock, controller, judge and record included. */
export async function nightSpeed(): Promise<Figure[]> {
  const hours = 4;
  const night = await simulateNight({
    length_ms: hours * 3_600_000,
    seed: 7,
    folder: null,
    paced: false,
  });
  return [{ name: "demo.hoursPerMinute", value: (hours * 60) / night.wallSeconds, unit: "h/min" }];
}
