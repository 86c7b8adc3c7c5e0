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

/** Ticks of the events through all strips, and the short ones of plain times under the foot. */
export function Ticks({ scene }: { scene: Scene }): VNode {
  const { layout } = scene;
  const foot = layout.case[1] + 4;
  return (
    <g>
      {marked(scene).map((e) => (
        <path
          key={e.id}
          class="bs-tick"
          d={`M${tickX(scene, e)} ${topAt(scene, tickX(scene, e))}V${foot}`}
        />
      ))}
    </g>
  );
}

/** Marks at the feet of the ticks, and what they mean. */
export function Events({ scene }: { scene: Scene }): VNode {
  const foot = scene.layout.case[1] + 4;
  return (
    <g>
      {marked(scene).map((e) => (
        <Mark key={e.id} x={tickX(scene, e)} y={foot} weight={e.weight} />
      ))}
      <EventWords scene={scene} />
    </g>
  );
}

/** Closer than this, px, two events of one kind are one mark. */
const TOGETHER_PX = 12;

/**
 * Events that changed the bench. What was refused, told by the link or written to the record is for
 * lists, not for the picture; a warning that comes again at once stands there once.
 */
function marked({ events, axis }: Scene): EventLine[] {
  const out: EventLine[] = [];
  for (const e of events) {
    if (eventWord(e) === "" && e.weight !== "trip") continue;
    const near = (o: EventLine): boolean => (e.at - o.at) / axis.msPerPx < TOGETHER_PX;
    if (!out.some((o) => o.kind === e.kind && o.hazard === e.hazard && near(o))) out.push(e);
  }
  return out;
}

const tickX = ({ axis }: Scene, e: EventLine): number => Math.max(5, Math.round(xAt(axis, e.at)));

/** Where the ceiling stands at a pixel: ticks begin there, not in the solid above it. */
function topAt({ columns, y, layout }: Scene, x: number): number {
  const i = columns.x.findIndex((cx) => cx >= x);
  const ceiling = columns.ceiling[i] ?? Number.NaN;
  return Number.isFinite(ceiling) ? Math.round(y(ceiling)) : layout.top;
}

interface NamedTag extends Tag {
  readonly class: string;
  readonly isTime: boolean;
}

/** Light follows arming by some seconds; the pair needs one word. */
const AFTER_ARMING_ms = 60_000;

function eventTags(scene: Scene): NamedTag[] {
  const { axis, layout } = scene;
  const events = marked(scene);
  const armed = events.filter((e) => e.kind === "armed");
  const told = events.filter(
    (e) =>
      e.kind !== "emitting" || !armed.some((a) => e.at >= a.at && e.at - a.at < AFTER_ARMING_ms),
  );
  return told.map((e) => ({
    x: xAt(axis, e.at),
    text: layout.phone ? clock(e.at) : `${clock(e.at)} ${eventWord(e)}`,
    rank: e.kind === "connected" ? 1 : RANKS[e.weight],
    class: CLASSES[e.weight],
    isTime: false,
  }));
}

/** Words of the events, and between them the plain time where nothing happened. */
function EventWords({ scene }: { scene: Scene }): VNode {
  const { layout } = scene;
  const tags = [...eventTags(scene), ...plainTimes(scene)];
  const within = {
    from: layout.margin,
    to: layout.g0 + (layout.phone ? 2 : 8),
    rows: layout.phone ? 1 : 2,
  };
  const foot = layout.case[1];
  return (
    <g>
      {placeTags(tags, layout.small, within).map(({ left, row, index }) => {
        const tag = tags[index];
        return tag === undefined ? null : (
          <g key={`${tag.text} ${tag.x}`}>
            {tag.isTime && <path class="bs-hair" d={`M${Math.round(tag.x)} ${foot}v7`} />}
            <text class={tag.class} x={left} y={layout.words + row * (layout.small + 4)}>
              {tag.text}
            </text>
          </g>
        );
      })}
    </g>
  );
}

/** Rounder times, so far apart that they do not crowd. */
function plainTimes({ axis, layout }: Scene): NamedTag[] {
  const wanted_ms = (layout.phone ? 90 : 130) * axis.msPerPx;
  const steps_ms = [1, 2, 5, 10, 20].map((min) => min * 60_000);
  const step_ms = steps_ms.find((ms) => ms >= wanted_ms) ?? 1_200_000;
  const out: NamedTag[] = [];
  const first = Math.ceil((axis.now - layout.g0 * axis.msPerPx) / step_ms) * step_ms;
  for (let t = first; t < axis.now; t += step_ms) {
    const x = xAt(axis, t);
    if (x > layout.margin && x < layout.g0 - 50) {
      out.push({ x, text: clock(t), rank: 1, rows: 1, class: "", isTime: true });
    }
  }
  return out;
}
