import type { VNode } from "preact";
import { bandPath, linePath } from "./path.ts";
import { isLit, type Scene } from "./scene.ts";

/** Half width of the band in which the model expects the output, as a share of it. */
const EXPECTED_SHARE = 0.05;

/** The output, in the light band where it is expected; the line leaving the band is the message. */
export function OutputStrip({ scene }: { scene: Scene }): VNode {
  const { columns, yOutput, outputLow } = scene;
  const part = (share: number): number[] =>
    columns.expected.map((e, i) =>
      isLit(columns.state[i] ?? 0) && e > 0 ? Math.max(outputLow, e * share) : Number.NaN,
    );
  return (
    <g>
      <path
        class="bs-open"
        d={bandPath(columns.x, part(1 + EXPECTED_SHARE), part(1 - EXPECTED_SHARE), yOutput)}
      />
      <path
        class="bs-measured"
        d={linePath({ x: columns.x, v: columns.output }, yOutput, outputLow)}
      />
    </g>
  );
}

/** The case: the trip level is a wall again, from edge to edge of the page. */
export function CaseStrip({ scene }: { scene: Scene }): VNode {
  const { columns, yCase, layout, now, stale } = scene;
  const wall = yCase(now.caseTrip_degC ?? 60);
  const warn = now.caseWarn_degC === null ? null : yCase(now.caseWarn_degC);
  const right = stale === "" ? layout.width : layout.g1;
  return (
    <g>
      <rect class="bs-open" x={0} y={wall} width={right} height={layout.case[1] - wall} />
      <path class="bs-ceiling" d={`M0 ${wall}H${layout.width}`} />
      {warn !== null && (
        <path class="bs-hair" d={`M0 ${warn}H${layout.g0}M${layout.g1} ${warn}H${right}`} />
      )}
      <path class="bs-measured" d={linePath({ x: columns.x, v: columns.degC }, yCase)} />
    </g>
  );
}

/** Names of the strips, over whatever crosses them. */
export function StripNames({ scene }: { scene: Scene }): VNode {
  const { layout, now, yCase } = scene;
  const output = layout.phone
    ? "output, where expected"
    : `output at ${now.wavelength_nm}\u00a0nm, in the band the model expects, ±5\u00a0%`;
  const level = now.caseTrip_degC === null ? "case" : `case; dark at ${now.caseTrip_degC}\u00a0°C`;
  return (
    <g>
      <text class="bs-on-solid" x={layout.margin} y={layout.output[0] - 5}>
        {output}
      </text>
      <text class="bs-on-solid" x={layout.margin} y={yCase(now.caseTrip_degC ?? 60) - 7}>
        {level}
      </text>
      {now.caseWarn_degC !== null && !layout.phone && (
        <text class="bs-on-open" x={layout.margin} y={yCase(now.caseWarn_degC) + layout.small + 3}>
          {`warns at ${now.caseWarn_degC}\u00a0°C`}
        </text>
      )}
    </g>
  );
}
