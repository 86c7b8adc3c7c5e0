import type { EventLine, Snapshot } from "../../daemon/desk/api.ts";
import type { Row } from "../now/track.ts";
import { type Columns, columnsOf, type TimeAxis, timeAxis } from "./columns.ts";
import type { Layout } from "./layout.ts";
import {
  type Bounds,
  caseBounds,
  corridorBounds,
  linear,
  outputBounds,
  type Scale,
} from "./scale.ts";

/** Everything that the parts of the picture need, made once a drawing. */
export interface Scene {
  readonly layout: Layout;
  readonly axis: TimeAxis;
  readonly columns: Columns;
  readonly bounds: Bounds;
  /** Currents, outputs and case temperatures to pixels. */
  readonly y: Scale;
  readonly yOutput: Scale;
  readonly yCase: Scale;
  readonly outputLow: number;
  readonly events: readonly EventLine[];
  readonly now: Snapshot;
  /** Why the numbers are not of now, "34 s old"; empty while they are. */
  readonly stale: string;
}

/** Codes of a row's state in which current is meant to flow. */
const ARMED = 2;
const EMITTING = 3;

export const isLit = (state: number): boolean => state === EMITTING;
export const isMeant = (state: number): boolean => state === EMITTING || state === ARMED;

export interface SceneInput {
  readonly layout: Layout;
  readonly rows: readonly Row[];
  readonly span_min: number;
  readonly now: Snapshot;
  readonly events: readonly EventLine[];
  readonly stale: string;
}

/** Lays the scene out: which second stands on which pixel, and how high every quantity stands. */
export function sceneOf({ layout, rows, span_min, now, events, stale }: SceneInput): Scene {
  const axis = timeAxis(now.at, span_min, layout.g0);
  const columns = columnsOf(rows, axis);
  const flowing =
    now.state === "emitting" && (now.current_mA ?? 0) > 1 ? [now.current_mA ?? 0] : [];
  const ceilings = [...columns.ceiling, now.ceiling_mA ?? Number.NaN];
  const floors = [...columns.floor, now.floor_mA ?? Number.NaN];
  const bounds = corridorBounds(ceilings, floors, flowing);
  const lit = columns.output.filter((_, i) => isLit(columns.state[i] ?? 0));
  const expected = columns.expected.filter((_, i) => isLit(columns.state[i] ?? 0));
  const output = outputBounds([...lit, ...expected]);
  const cases = caseBounds([...columns.degC, now.case_degC ?? Number.NaN], now.caseTrip_degC);
  return {
    layout,
    axis,
    columns,
    bounds,
    y: linear(bounds.high, bounds.low, layout.top, layout.corridor),
    yOutput: linear(output.high, output.low, layout.output[0], layout.output[1]),
    yCase: linear(cases.high, cases.low, layout.case[0], layout.case[1]),
    outputLow: output.low,
    events: events.filter((e) => e.at >= axis.now - span_min * 60_000 && e.at <= now.at + 1000),
    now,
    stale,
  };
}
