import type { VNode } from "preact";
import type { EventLine } from "../../daemon/desk/api.ts";
import { clock } from "../words/format.ts";
import { xAt } from "./columns.ts";
import { placeTags, type Tag } from "./labels.ts";
import { Mark } from "./marks.tsx";
import type { Scene } from "./scene.ts";

const WORDS: Readonly<Record<string, string>> = {
  armed: "armed",
  emitting: "light",
  dark: "dark",
  trip: "trip",
  reset: "reset",
  capped: "held",
  uncapped: "free again",
  set: "set",
  connected: "board here",
  disconnected: "board gone",
  adopted: "new bench file",
};
const RANKS = { trip: 4, warn: 3, calm: 2 } as const;

/** A word or two for a mark; empty where the mark alone is enough. */
export function eventWord(e: Pick<EventLine, "kind" | "hazard" | "words">): string {
  if (e.kind === "warning") return e.hazard.replaceAll("-", " ");
  if (e.kind === "set") return `${/\d+\.\d+.A/.exec(e.words)?.[0] ?? ""} set`.trim();
  return WORDS[e.kind] ?? "";
}

const CLASSES = { calm: "", warn: "bs-w", trip: "bs-r" } as const;

/** Events as ticks through all strips, each with its mark at the foot and its words below. */
export function Events({ scene }: { scene: Scene }): VNode {
  const { events, axis, layout } = scene;
  const foot = layout.case[1] + 4;
  const marked = events.filter((e) => e.kind !== "refused");
  return (
    <g>
      {marked.map((e) => {
        const x = Math.max(1, Math.round(xAt(axis, e.at)));
        return (
          <g key={e.id}>
            <path class="bs-tick" d={`M${x} ${topAt(scene, x)}V${foot}`} />
            <Mark x={x} y={foot} weight={e.weight} />
          </g>
        );
      })}
      <EventWords scene={scene} events={marked} />
    </g>
  );
}

/** Where the ceiling stands at a pixel: ticks begin there, not in the solid above it. */
function topAt({ columns, y, layout }: Scene, x: number): number {
  const i = columns.x.findIndex((cx) => cx >= x);
  const ceiling = columns.ceiling[i] ?? Number.NaN;
  return Number.isFinite(ceiling) ? Math.round(y(ceiling)) : layout.top;
}

/** Words of the events, and between them the plain time where nothing happened. */
function EventWords({ scene, events }: { scene: Scene; events: readonly EventLine[] }): VNode {
  const { axis, layout } = scene;
  const tags: (Tag & { class: string })[] = events.map((e) => {
    const word = eventWord(e);
    const text = layout.phone || word === "" ? clock(e.at) : `${clock(e.at)} ${word}`;
    const rank = word === "" ? 0 : RANKS[e.weight];
    return { x: xAt(axis, e.at), text: word === "" ? "" : text, rank, class: CLASSES[e.weight] };
  });
  tags.push(...plainTimes(scene));
  const named = tags.filter((tag) => tag.text !== "");
  const within = {
    from: layout.margin,
    to: layout.g0 + (layout.phone ? 2 : 8),
    rows: layout.phone ? 1 : 2,
  };
  return (
    <g>
      {placeTags(named, layout.small, within).map(({ left, row, index }) => (
        <text
          key={index}
          class={named[index]?.class ?? ""}
          x={left}
          y={layout.words + row * (layout.small + 4)}
        >
          {named[index]?.text}
        </text>
      ))}
    </g>
  );
}

/** Five-minute or rounder times, so far apart that they do not crowd. */
function plainTimes({ axis, layout }: Scene): (Tag & { class: string })[] {
  const wanted_ms = (layout.phone ? 90 : 130) * axis.msPerPx;
  const step =
    [1, 2, 5, 10, 20].map((min) => min * 60_000).find((ms) => ms >= wanted_ms) ?? 1_200_000;
  const out: (Tag & { class: string })[] = [];
  const first = Math.ceil((axis.now - layout.g0 * axis.msPerPx) / step) * step;
  for (let t = first; t < axis.now; t += step) {
    const x = xAt(axis, t);
    if (x > layout.margin && x < layout.g0 - 50)
      out.push({ x, text: clock(t), rank: 1, class: "" });
  }
  return out;
}
