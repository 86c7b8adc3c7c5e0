import type { VNode } from "preact";
import { xAt } from "./columns.ts";
import { widthOf } from "./labels.ts";
import { Hatch, Mark } from "./marks.tsx";
import { bandPath, linePath, longRuns, type Run, runs } from "./path.ts";
import { isLit, isMeant, type Scene } from "./scene.ts";

/** The corridor up to now: an opening cut through the page, the current walking inside. */
export function Past({ scene }: { scene: Scene }): VNode {
  const { columns, y, bounds } = scene;
  const bottom = columns.floor.map((floor, i) =>
    Number.isFinite(floor) ? Math.min(floor, columns.ceiling[i] ?? floor) : bounds.low,
  );
  return (
    <g>
      <path class="bs-open" d={bandPath(columns.x, columns.ceiling, bottom, y)} />
      <path class="bs-floor" d={linePath({ x: columns.x, v: columns.floor }, y, bounds.low)} />
      <path class="bs-ceiling" d={linePath({ x: columns.x, v: columns.ceiling }, y)} />
      <Held scene={scene} />
      <path class="bs-current" d={linePath({ x: columns.x, v: columns.current }, y, bounds.low)} />
      <Trips scene={scene} />
      <Gaps scene={scene} />
    </g>
  );
}

const xOf = (scene: Scene, i: number): number => scene.columns.x[i] ?? 0;

/** Stretches in which the asked current lay above the ceiling while light was on. */
export function heldRuns({ columns }: Scene): Run[] {
  const held = (i: number): true | undefined =>
    isLit(columns.state[i] ?? 0) && (columns.asked[i] ?? 0) > (columns.ceiling[i] ?? 0) + 0.5
      ? true
      : undefined;
  return runs(columns.x.length, held);
}

/** The coloured edge under a current that is held down. */
function Held({ scene }: { scene: Scene }): VNode {
  const { columns, y } = scene;
  return (
    <g>
      {heldRuns(scene).map(({ from, to }) => {
        const part = { x: columns.x.slice(from, to), v: columns.ceiling.slice(from, to) };
        return <path key={from} class="bs-held" d={linePath(part, y)} />;
      })}
    </g>
  );
}

/** A trip is a line that falls; its square stands on the fall. */
function Trips({ scene }: { scene: Scene }): VNode {
  const { events, axis, y, bounds, columns, layout } = scene;
  const middle = y(bounds.low + 0.55 * (bounds.high - bounds.low));
  const fell = (at: number): boolean =>
    columns.t.some((t, i) => Math.abs(t - at) < 4000 && isMeant(columns.state[i] ?? 0));
  return (
    <g>
      {events
        .filter((e) => e.kind === "trip" && fell(e.at))
        .map((e) => (
          <Mark
            key={e.id}
            x={Math.min(Math.round(xAt(axis, e.at)), layout.g0 - 5)}
            y={middle}
            weight="trip"
          />
        ))}
    </g>
  );
}

/** Stretches of which nothing is known, over all strips. */
function Gaps({ scene }: { scene: Scene }): VNode {
  const { columns, layout } = scene;
  const unknown = (i: number): true | undefined =>
    Number.isFinite(columns.ceiling[i] ?? 0) || Number.isFinite(columns.degC[i] ?? 0)
      ? undefined
      : true;
  return (
    <g>
      {runs(columns.x.length, unknown).map(({ from, to }) => {
        const left = xOf(scene, Math.max(0, from - 1));
        const right = to < columns.x.length ? xOf(scene, to) : layout.g0;
        return (
          <Hatch
            key={from}
            x={left}
            y={layout.top}
            width={right - left}
            height={layout.case[1] - layout.top}
          />
        );
      })}
    </g>
  );
}

const MAKER_NAMES = [
  ["derating, by case temperature", "derating"],
  ["junction limit", "junction"],
  ["bench limit", "bench limit"],
  ["the limit asked for", "asked limit"],
  ["the plan's limit", "plan"],
  ["a hazard", "hazard"],
  ["the limit while unattended", "unattended"],
  ["the board's own limit", "board limit"],
] as const;

/** Shorter than this, px, and a change of maker is not a place to write at. */
const MAKER_PX_MIN = 6;

/** The ceiling's maker rides along it; a notch stands where the maker changes. */
export function Makers({ scene }: { scene: Scene }): VNode {
  const { columns, y, layout } = scene;
  const maker = (i: number): number | undefined =>
    Number.isFinite(columns.ceiling[i] ?? Number.NaN) ? columns.maker[i] : undefined;
  const stretches = longRuns(runs(columns.x.length, maker), MAKER_PX_MIN);
  return (
    <g>
      {stretches.map(({ from, to, is }, k) => {
        const joined = stretches[k - 1]?.to === from;
        const name = MAKER_NAMES[is]?.[layout.phone ? 1 : 0] ?? "";
        const text = layout.phone ? name : `ceiling: ${name}`;
        const start = Math.max(layout.margin - xOf(scene, from), joined ? 14 : 6);
        const fits =
          xOf(scene, to - 1) - xOf(scene, from) - start > widthOf(text, layout.small) + 6;
        const top = y(columns.ceiling[from] ?? 0);
        return (
          <g key={columns.t[from]}>
            {joined && <path class="bs-line-ink" d={`M${xOf(scene, from)} ${top - 7}v14`} />}
            {fits && <Riding scene={scene} run={{ from, to }} text={text} start={start} />}
          </g>
        );
      })}
    </g>
  );
}

/** Words along the ceiling. Their path takes every twelfth column, so that letters do not shake. */
function Riding(props: { scene: Scene; run: Run; text: string; start: number }): VNode {
  const { scene, run, text, start } = props;
  const { columns, y, layout } = scene;
  const picked: number[] = [];
  for (let i = run.from; i < run.to; i += 12) picked.push(i);
  picked.push(run.to - 1);
  const part = {
    x: picked.map((i) => xOf(scene, i)),
    v: picked.map((i) => columns.ceiling[i] ?? Number.NaN),
  };
  const id = `bs-ride-${run.from}`;
  return (
    <g>
      <path id={id} fill="none" d={linePath(part, (v) => y(v) - (layout.phone ? 6 : 9))} />
      <text>
        <textPath href={`#${id}`} startOffset={start}>
          {text}
        </textPath>
      </text>
    </g>
  );
}
