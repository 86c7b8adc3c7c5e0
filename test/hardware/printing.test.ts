import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { guessStream, type HeardLine } from "../../daemon/link/plain/guess.ts";
import { pieceOf } from "../../daemon/link/plain/piece.ts";
import { benchWith, Watched } from "../unit/loop/watched.ts";
import { buildOther, CYCLES_PER_ms, Simulator } from "./simulator.ts";

const SECONDS = 6;
const serial = { kind: "serial", path: "/dev/ttyUSB0", baud: 115_200 } as const;

let chip: Simulator;
const lines: HeardLine[] = [];

beforeAll(async () => {
  chip = new Simulator(buildOther("printing", "printing.elf"));
  let rest = "";
  for (let cycle = 0; cycle < SECONDS * 1000 * CYCLES_PER_ms; ) {
    const { state, sent } = await chip.run(20 * CYCLES_PER_ms);
    cycle = state.cycle;
    for (const { cycle: at, bytes } of sent) {
      rest += bytes.toString("latin1");
      const parts = rest.split("\r\n");
      rest = parts.pop() ?? "";
      for (const line of parts) lines.push({ line, at_ms: at / CYCLES_PER_ms });
    }
  }
}, 60_000);
afterAll(() => chip.stop());

describe("a chip whose firmware merely prints", () => {
  test("is guessed right, and watched end to end by what the guess proposes", () => {
    expect(lines.length).toBeGreaterThan(150);
    const guess = guessStream(lines);
    expect(guess).toMatchObject({ format: "csv", time: { from: "1", unit: "ms" }, undecided: [] });
    expect(guess.columns.map(({ channel, unit }) => [channel, unit])).toEqual([
      ["current", "mA"],
      ["case", "°C"],
    ]);
    const piece = pieceOf(guess, serial).split("\n").slice(2).join("\n");
    const rig = new Watched(benchWith(`\n${piece}`));
    rig.loop.opened(rig.now as never);
    for (const { line, at_ms } of lines) {
      rig.now = 1000 + at_ms;
      rig.loop.receive([{ line, at: rig.now as never }]);
    }
    const now = rig.snapshot();
    expect(now).toMatchObject({ state: "emitting", watchOnly: true, warnings: [] });
    expect(now.current_mA).toBeGreaterThanOrEqual(1518);
    expect(now.current_mA).toBeLessThanOrEqual(1522);
    expect(now.case_degC).toBeGreaterThan(32);
    expect(now.case_degC).toBeLessThan(33.5);
    expect(rig.kinds()).toEqual(["connected", "light-seen"]);
  });
});
