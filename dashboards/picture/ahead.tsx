import type { VNode } from "preact";
import { clock, isKnown } from "../words/format.ts";
import type { Columns } from "./columns.ts";
import { ExpectedMark } from "./marks.tsx";
import { linear } from "./scale.ts";
import type { Scene } from "./scene.ts";

/** How far the future may reach on the picture, minutes. */
const AHEADS_min = [3, 6, 12, 24] as const;
const AHEAD_min_max = 24;
/** The future gets at least this share of the past's length: about the same scale. */
const AHEAD_SHARE = 0.6;

/** The shortest future that has the past's scale and the expected moment in it. */
export function aheadFor(span_min: number, forecast: Forecast): number {
  const wanted = forecast.kind === "cap" ? forecast.in_min * 1.2 : 0;
  const least = Math.max(span_min * AHEAD_SHARE, Math.min(wanted, AHEAD_min_max));
  return AHEADS_min.find((min) => min >= least) ?? AHEAD_min_max;
}
/** A ceiling that would move by less than this share over the whole future stands still. */
const STILL_SHARE = 0.02;
/** How much past decides whether it stands still, ms, and how much at least must be known. */
const LOOK_BACK_ms = 180_000;
const LOOK_BACK_ms_MIN = 60_000;

/** What may happen: when the ceiling meets the current, or that all stands still, or nothing known. */
export type Forecast =
  | { readonly kind: "cap"; readonly in_min: number }
  | { readonly kind: "still" }
  | { readonly kind: "none" };

/** The first forecast: the daemon's time to the cap, or the plain sight that nothing moves. */
export function forecastOf(columns: Columns, now: Scene["now"]): Forecast {
  const lit = now.state === "emitting";
  if (lit && !now.capped && isKnown(now.timeToCap_s)) {
    return { kind: "cap", in_min: Math.max(0, now.timeToCap_s / 60) };
  }
  const ceiling = now.ceiling_mA;
  if (!isKnown(ceiling)) return { kind: "none" };
  const i = columns.t.findIndex((t) => t >= now.at - LOOK_BACK_ms);
  const [t, before] = [columns.t[i], columns.ceiling[i]];
  if (t === undefined || !isKnown(before) || now.at - t < LOOK_BACK_ms_MIN) return { kind: "none" };
  const moved = (Math.abs(ceiling - before) * AHEAD_min_max * 60_000) / (now.at - t);
  return moved < STILL_SHARE * ceiling ? { kind: "still" } : { kind: "none" };
}

/** Right of now: everything dotted and italic, and nothing at all where nothing is known. */
export function Ahead({ scene }: { scene: Scene }): VNode {
  const { layout, now, stale } = scene;
  const forecast: Forecast = stale === "" ? forecastOf(scene.columns, now) : { kind: "none" };
  const span_min = (scene.axis.x0 * scene.axis.msPerPx) / 60_000;
  const ahead_min = aheadFor(span_min, forecast);
  const middle = (scene.y(now.ceiling_mA ?? 0) + scene.y(now.floor_mA ?? scene.bounds.low)) / 2;
  const why =
    stale !== ""
      ? "no forecast from old readings"
      : now.state === "emitting"
        ? "no forecast yet"
        : "no forecast while dark";
  return (
    <g>
      {forecast.kind === "cap" && (
        <UntilCap scene={scene} in_min={forecast.in_min} ahead_min={ahead_min} />
      )}
      {forecast.kind === "still" && <Still scene={scene} />}
      {forecast.kind === "none" ? (
        <text
          class="bs-i"
          x={layout.g1 + (layout.phone ? 6 : 24)}
          y={Number.isFinite(middle) ? middle : 90}
        >
          {layout.phone ? "no forecast" : why}
        </text>
      ) : (
        <text
          class="bs-i"
          x={layout.width - (layout.phone ? 8 : 24)}
          y={layout.words}
          text-anchor="end"
        >
          {`+${ahead_min}\u00a0min`}
        </text>
      )}
    </g>
  );
}

/**
 * The ceiling comes down to what was asked; from there on the current would go with it, and where to
 * is not known: a paler opening without an edge.
 */
function UntilCap(props: { scene: Scene; in_min: number; ahead_min: number }): VNode {
  const { scene, in_min, ahead_min } = props;
  const { layout, now, y } = scene;
  const x = linear(0, ahead_min, layout.g1, layout.width);
  const asked = now.asked_mA ?? now.aim_mA ?? now.current_mA ?? 0;
  const ceiling = now.ceiling_mA ?? asked;
  const seen = in_min <= ahead_min;
  const end_min = Math.min(in_min, ahead_min);
  const share = in_min === 0 ? 1 : end_min / in_min;
  const endY = y(ceiling + (asked - ceiling) * share);
  const floorY = y(now.floor_mA ?? scene.bounds.low);
  const [g1, end] = [layout.g1, x(end_min)];
  const rest = layout.width - end;
  const text = `held, about ${clock(now.at + in_min * 60_000)}`;
  return (
    <g>
      <path class="bs-open" d={`M${g1} ${y(ceiling)}L${end} ${endY}V${floorY}H${g1}Z`} />
      {rest > 0 && <rect class="bs-half" x={end} y={endY} width={rest} height={floorY - endY} />}
      <path class="bs-dotted" d={`M${g1} ${y(ceiling)}L${end} ${endY}`} />
      <path class="bs-dotted bs-dotted--current" d={`M${g1} ${y(asked)}H${end}`} />
      {isKnown(now.floor_mA) && (
        <path class="bs-dotted bs-dotted--floor" d={`M${g1} ${floorY}H${layout.width}`} />
      )}
      {seen && <ExpectedMark x={end} y={y(asked)} />}
      {seen && !layout.phone && (
        <text
          class="bs-w bs-i"
          x={Math.min(end - 4, layout.width - 150)}
          y={y(asked) + layout.small + 14}
        >
          {text}
        </text>
      )}
    </g>
  );
}

function Still({ scene }: { scene: Scene }): VNode {
  const { layout, now, y, yOutput, yCase } = scene;
  const lit = now.state === "emitting";
  const top = y(now.ceiling_mA ?? 0);
  const low = y(now.floor_mA ?? scene.bounds.low);
  const run = (at: number, name = ""): VNode => (
    <path class={`bs-dotted ${name}`} d={`M${layout.g1} ${at}H${layout.width}`} />
  );
  return (
    <g>
      <rect
        class="bs-open"
        x={layout.g1}
        y={top}
        width={layout.width - layout.g1}
        height={low - top}
      />
      {run(top)}
      {isKnown(now.floor_mA) && run(low, "bs-dotted--floor")}
      {lit && isKnown(now.current_mA) && run(y(now.current_mA), "bs-dotted--current")}
      {lit && isKnown(now.output_mW) && run(yOutput(now.output_mW))}
      {isKnown(now.case_degC) && run(yCase(now.case_degC))}
    </g>
  );
}
