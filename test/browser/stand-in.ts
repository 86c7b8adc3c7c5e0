import type { AddressInfo } from "node:net";
import type { SwitchAnswer } from "../../daemon/control/api.ts";
import type { Question } from "../../daemon/control/client.ts";
import { Live } from "../../daemon/desk/live.ts";
import { buildServer } from "../../daemon/desk/server.ts";
import { SignIn } from "../../daemon/desk/sign-in.ts";
import type { SeriesAnswer, SeriesTrace } from "../../daemon/model/series.ts";
import { wall } from "../../daemon/model/times.ts";
import { pagesRoot } from "../../daemon/paths.ts";
import { evening, eventsOf, type Kind, snapshotOf } from "./story.ts";

/** Record names of a story's quantities. */
const NAMES = {
  current: "current",
  ceiling: "judge.ceiling",
  floor: "judge.floor",
  maker: "judge.maker",
  asked: "judge.asked",
  output: "photodiode",
  expected: "judge.expected",
  degC: "case",
  state: "judge.state",
} as const;

/** A stretch without record, minutes before now: the picture must hatch it. */
const GAP = { from: 22, to: 19.5 };

function seriesOf(kind: Kind, at: number): SeriesAnswer {
  const gap = { from: wall(at - GAP.from * 60_000), to: wall(at - GAP.to * 60_000) };
  const kept = evening(kind, at).filter((m) => m.t < gap.from || m.t > gap.to);
  const t = Float64Array.from(kept, (m) => m.t);
  const n = new Float64Array(t.length).fill(1);
  const channels: Record<string, SeriesTrace> = {};
  for (const [key, name] of Object.entries(NAMES) as [keyof typeof NAMES, string][]) {
    const v = Float64Array.from(kept, (m) => m[key]);
    channels[name] = { t, min: v, mean: v, max: v, n };
  }
  return { channels, gaps: kind === "near" ? [gap] : [], step_ms: 1000 };
}

export interface StandIn {
  readonly address: string;
  readonly questions: Question[];
  close(): Promise<void>;
}

/**
 * The real desk's server with the built pages over an invented evening, signed in by code
 * "stand-in-code-0001". `silent` sends one snapshot and then nothing more.
 */
export async function standIn(kind: Kind, silent = false, port = 0): Promise<StandIn> {
  const began = Date.now();
  const sign = new SignIn("t".repeat(43));
  for (let i = 1; i <= 9; i++) sign.offer(`stand-in-code-000${i}`);
  const live = new Live();
  const questions: Question[] = [];
  const ask = async (question: Question): Promise<SwitchAnswer> => {
    questions.push(question);
    return { id: 1, ok: true, reason: "", words: "Done." };
  };
  const at = (): number => (silent ? began : Date.now());
  const app = await buildServer({
    config: { host: "127.0.0.1", darkPort: 0, names: [] },
    pages: pagesRoot,
    sign,
    line: { ask, connected: true },
    live,
    record: {
      series: async () => seriesOf(kind, began),
      events: () =>
        eventsOf(kind, began).map((e) => ({
          id: e.id,
          wall: wall(e.at),
          kind: e.kind as "armed",
          hazard: e.hazard,
          data: { words: e.words, weight: e.weight },
        })),
    },
  });
  await app.listen({ host: "127.0.0.1", port });
  live.line(true);
  const push = (): void => live.take({ push: "snapshot", snapshot: snapshotOf(kind, at()) });
  push();
  const timer = silent ? undefined : setInterval(push, 100);
  return {
    address: `http://127.0.0.1:${(app.server.address() as AddressInfo).port}`,
    questions,
    async close() {
      clearInterval(timer);
      live.close();
      await app.close();
    },
  };
}
