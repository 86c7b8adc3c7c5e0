import type { VNode } from "preact";
import { amps, clock, degrees, isKnown, power } from "../words/format.ts";
import { spread } from "./labels.ts";
import { Hatch } from "./marks.tsx";
import type { Scene } from "./scene.ts";

interface Label {
  readonly y: number;
  readonly text: string;
  readonly class: string;
  readonly size: number;
}

/** Least height, px, in which a dimension arrow with its number has room. */
const ARROW_PX_MIN = 44;

/** The section at now, as a building is drawn: heights with arrows, and every present number. */
export function Section({ scene }: { scene: Scene }): VNode {
  const { layout, now, y, stale } = scene;
  const { g0, g1 } = layout;
  const foot = layout.case[1] + 5;
  const ceiling = now.ceiling_mA ?? Number.NaN;
  const floor = now.floor_mA ?? scene.bounds.low;
  const opening = `M${g0 - 0.5} ${y(ceiling)}H${g1 + 0.5}V${y(Math.min(floor, ceiling))}H${g0 - 0.5}Z`;
  return (
    <g>
      {isKnown(now.ceiling_mA) && <path class="bs-open" d={opening} />}
      <path class="bs-hair" d={`M${g0} 0V${foot}M${g1} 0V${foot}`} />
      {stale !== "" && (
        <Hatch x={g0} y={layout.top} width={g1 - g0} height={layout.case[1] - layout.top} />
      )}
      <Ticks scene={scene} />
      {stale === "" && <Arrows scene={scene} />}
      <Heights scene={scene} />
      <Numbers scene={scene} />
      {stale !== "" && <Stale scene={scene} />}
    </g>
  );
}

const arrowX = (scene: Scene): number => scene.layout.g0 + (scene.layout.phone ? 10 : 16);
const textX = (scene: Scene): number => arrowX(scene) + (scene.layout.phone ? 7 : 12);

const flows = ({ now }: Scene): boolean => now.state === "emitting" && isKnown(now.current_mA);

/** Ends of the ceiling, the floor and the current, carried into the section. */
function Ticks({ scene }: { scene: Scene }): VNode {
  const { layout, now, y, bounds } = scene;
  const tick = (value: number | null, name: string): VNode | null =>
    isKnown(value) ? (
      <path
        class={name}
        d={`M${layout.g0 - 1} ${y(Math.max(bounds.low, value))}H${arrowX(scene) + 4}`}
      />
    ) : null;
  return (
    <g>
      {tick(now.floor_mA, "bs-floor")}
      {tick(now.ceiling_mA, "bs-ceiling")}
      {tick(now.current_mA, "bs-current")}
    </g>
  );
}

/** Whether a number fits between two heights with an arrow beside it. */
const hasRoom = (scene: Scene, upper: number | null, lower: number | null): boolean =>
  isKnown(upper) && isKnown(lower) && scene.y(lower) - scene.y(upper) > ARROW_PX_MIN;

function Arrows({ scene }: { scene: Scene }): VNode | null {
  const { now } = scene;
  if (!flows(scene)) return null;
  const { ceiling_mA: top, current_mA: mid, floor_mA: low } = now;
  return (
    <g>
      {hasRoom(scene, top, mid) && !now.capped && (
        <Arrow scene={scene} from={top} to={mid} text={`${amps(now.headroom_mA)} room`} />
      )}
      {hasRoom(scene, mid, low) && (
        <Arrow scene={scene} from={mid} to={low} text={`${amps(now.margin_mA)} margin`} />
      )}
    </g>
  );
}

function Arrow(props: {
  scene: Scene;
  from: number | null;
  to: number | null;
  text: string;
}): VNode {
  const { scene, from, to, text } = props;
  const x = arrowX(scene);
  const u = scene.y(from ?? 0);
  const v = scene.y(Math.max(scene.bounds.low, to ?? 0));
  const heads = `M${x - 3} ${u + 8}l3 -5l3 5M${x - 3} ${v - 8}l3 5l3 -5`;
  // The number stands clear of the labels that hang under both lines.
  const middle = Math.max((u + v) / 2 + 4, u + 2.4 * scene.layout.number + 12);
  return (
    <g>
      <path class="bs-line" d={`M${x} ${u + 4}V${v - 4}${heads}`} />
      <text x={textX(scene)} y={Math.min(middle, v - 8)}>
        {text}
      </text>
    </g>
  );
}

/** Names and numbers of ceiling, current and floor, pushed apart where they would collide. */
function heights(scene: Scene): Label[] {
  const { layout, now, y, bounds, stale } = scene;
  const size = layout.number;
  const labels: Label[] = [];
  const add = (value: number | null, dy: number, text: string, name = "bs-k", px = size): void => {
    if (isKnown(value)) {
      labels.push({ y: y(Math.max(bounds.low, value)) + dy, text, class: name, size: px });
    }
  };
  const held = now.capped && stale === "" ? "bs-w" : "bs-k";
  add(now.ceiling_mA, -7, `${amps(now.ceiling_mA)} ceiling`, held);
  if (flows(scene)) {
    const word = layout.phone ? "now" : "current";
    const text = now.capped ? "current is here" : `${amps(now.current_mA)} ${word}`;
    add(now.current_mA, size + 5, text, held);
    if (!now.capped && !hasRoom(scene, now.ceiling_mA, now.current_mA)) {
      const under = (now.headroom_mA ?? 0) >= 0 ? "room" : "over";
      const room = `${amps(Math.abs(now.headroom_mA ?? Number.NaN))} ${under}`;
      add(now.current_mA, 2 * size + 8, room, "", layout.small);
    }
  }
  add(now.floor_mA, size + 4, `${amps(now.floor_mA)} ${layout.phone ? "floor" : "threshold"}`);
  if (!flows(scene)) add(now.current_mA, size + 4, "0\u00a0A, dark");
  return labels.sort((a, b) => a.y - b.y);
}

function Heights({ scene }: { scene: Scene }): VNode {
  const { layout } = scene;
  const labels = heights(scene);
  const lowest = layout.output[0] + 4;
  const ys = spread(
    labels.map((label) => label.y),
    layout.number + 3,
    lowest,
  );
  return (
    <g>
      {labels.map((label, i) => (
        <text
          key={label.text}
          class={`${label.class}`}
          x={textX(scene)}
          y={Math.max(layout.number, ys[i] ?? 0)}
          style={{ fontSize: `${label.size}px` }}
        >
          {label.text}
        </text>
      ))}
    </g>
  );
}

/** Output, case and time at now. */
function Numbers({ scene }: { scene: Scene }): VNode {
  const { layout, now, yOutput, yCase, outputLow, stale } = scene;
  const x = textX(scene) - (layout.phone ? 4 : 0);
  const clamp = (v: number, [from, to]: readonly [number, number]): number =>
    Math.min(to - 2, Math.max(from + layout.number, v));
  const number = (y: number, text: string): VNode => (
    <text class="bs-k" x={x} y={y} style={{ fontSize: `${layout.number}px` }}>
      {text}
    </text>
  );
  const wall = now.caseTrip_degC === null ? layout.case[0] : yCase(now.caseTrip_degC) + 2;
  const output = yOutput(Math.max(outputLow, now.output_mW ?? outputLow)) + 5;
  return (
    <g>
      {number(clamp(output, layout.output), power(now.output_mW))}
      {number(clamp(yCase(now.case_degC ?? 0) + 5, [wall, layout.case[1]]), degrees(now.case_degC))}
      {number(layout.words, `${clock(now.at)} ${stale === "" ? "now" : "last"}`)}
    </g>
  );
}

/** Says on the hatch how old the numbers are. */
function Stale({ scene }: { scene: Scene }): VNode {
  const { layout, y, now, bounds, stale } = scene;
  const floor = now.floor_mA ?? bounds.low;
  const middle = (y(now.current_mA ?? floor) + y(floor)) / 2;
  const x = arrowX(scene);
  const at = Math.min(Math.max(middle, 130), layout.corridor - 30);
  return (
    <g>
      <rect class="bs-open" x={x - 6} y={at - 24} width={layout.g1 - x - 4} height={46} />
      <text class="bs-w" x={x + 2} y={at - 5} style={{ fontSize: `${layout.number}px` }}>
        {stale}
      </text>
      <text class="bs-w" x={x + 2} y={at + 13}>
        not now
      </text>
    </g>
  );
}
