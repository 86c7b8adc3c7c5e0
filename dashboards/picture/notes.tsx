import type { VNode } from "preact";
import { amps, clock } from "../words/format.ts";
import { widthOf } from "./labels.ts";
import { heldRuns } from "./past.tsx";
import { runs } from "./path.ts";
import { isLit, type Scene } from "./scene.ts";

/** Words inside the opening: what was asked, where the floor is, where the scale is broken. */
export function Notes({ scene }: { scene: Scene }): VNode {
  return (
    <g>
      <Asked scene={scene} />
      <HeldSince scene={scene} />
      <FloorName scene={scene} />
      <DarkName scene={scene} />
    </g>
  );
}

/** "1.80 A as asked" under every stretch that flowed as asked and is wide enough for the words. */
function Asked({ scene }: { scene: Scene }): VNode {
  const { columns, y, layout } = scene;
  const asAsked = (i: number): number | undefined => {
    const asked = Math.round(columns.asked[i] ?? 0);
    const close = Math.abs((columns.current[i] ?? 0) - asked) < 0.02 * asked;
    return isLit(columns.state[i] ?? 0) && close ? asked : undefined;
  };
  return (
    <g>
      {runs(columns.x.length, asAsked).map(({ from, to, is }) => {
        const text = `${amps(is)} as asked`;
        const x = Math.max(columns.x[from] ?? 0, 0) + (layout.phone ? 10 : 14);
        const fits = (columns.x[to - 1] ?? 0) - x > widthOf(text, layout.small) + 10;
        return fits ? (
          <text key={columns.t[from]} class="bs-k bs-on-open" x={x} y={y(is) + layout.small + 8}>
            {text}
          </text>
        ) : null;
      })}
    </g>
  );
}

/** Since when the current is held down, under the coloured edge. */
function HeldSince({ scene }: { scene: Scene }): VNode {
  const { columns, y, layout } = scene;
  return (
    <g>
      {heldRuns(scene).map(({ from, to }) => {
        // After a gap nobody knows since when.
        const begins = Number.isFinite(columns.ceiling[from - 1] ?? Number.NaN);
        const since = begins ? ` from ${clock(columns.t[from] ?? 0)}` : "";
        const text = layout.phone ? "held" : `held down${since}`;
        const width = widthOf(text, layout.small);
        const x = columns.x[from] ?? 0;
        const lowest = Math.min(
          ...columns.ceiling.slice(from, Math.min(to, from + Math.ceil(width))),
        );
        return (columns.x[to - 1] ?? 0) - x > width ? (
          <text
            key={columns.t[from]}
            class="bs-w bs-on-open"
            x={x + 5}
            y={y(lowest) + layout.small + 8}
          >
            {text}
          </text>
        ) : null;
      })}
    </g>
  );
}

function FloorName({ scene }: { scene: Scene }): VNode | null {
  const { columns, y, layout, bounds } = scene;
  const at = columns.x.findIndex(
    (x, i) => x >= layout.margin && Number.isFinite(columns.floor[i] ?? Number.NaN),
  );
  const text = layout.phone ? "floor" : "floor: threshold at this temperature";
  const width = widthOf(text, layout.small);
  const x = columns.x[at] ?? layout.g0;
  if (at < 0 || x + width > layout.g0) return null;
  const lowest = Math.min(
    ...columns.floor.slice(at, at + Math.ceil(width)).filter(Number.isFinite),
  );
  const place = y(Math.max(lowest, bounds.low)) + layout.small + 5;
  return place > layout.corridor + layout.small + 6 ? null : (
    <text class="bs-on-solid" x={x + (x > layout.margin + 2 ? 6 : 0)} y={place}>
      {text}
    </text>
  );
}

/** Where the current dropped out under the scale, the line says so; a phone has no room for it. */
function DarkName({ scene }: { scene: Scene }): VNode | null {
  const { columns, y, layout, bounds } = scene;
  const isUnder = (i: number): true | undefined =>
    (columns.current[i] ?? Number.NaN) < Math.max(bounds.low, 20) ? true : undefined;
  const last = runs(columns.x.length, isUnder).pop();
  if (last === undefined || layout.phone) return null;
  const x = Math.max((columns.x[last.from] ?? 0) + 8, layout.margin);
  const room = (columns.x[last.to - 1] ?? 0) - x;
  const long = "dark, 0\u00a0A; the scale is broken here";
  const words = [...(bounds.low > 0 ? [long] : []), "dark, 0\u00a0A"].find(
    (text) => widthOf(text, layout.small) < room,
  );
  return words === undefined ? null : (
    <text class="bs-k bs-on-solid" x={x} y={y(bounds.low) - 7}>
      {words}
    </text>
  );
}
