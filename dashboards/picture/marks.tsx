import type { VNode } from "preact";

export type Weight = "calm" | "warn" | "trip";

const CLASSES = { calm: "bs-fill-ink", warn: "bs-fill-warn", trip: "bs-fill-trip" } as const;

/** Dot, diamond or square: shape and colour say the same, so either is enough. */
export function Mark({ x, y, weight }: { x: number; y: number; weight: Weight }): VNode {
  const name = CLASSES[weight];
  if (weight === "trip") {
    return <rect class={name} x={x - 4.5} y={y - 4.5} width={9} height={9} />;
  }
  if (weight === "warn") {
    return <path class={name} d={`M${x - 5.5} ${y}l5.5 -5.5l5.5 5.5l-5.5 5.5Z`} />;
  }
  return <circle class={name} cx={x} cy={y} r={2.6} />;
}

/** The hollow diamond of something expected. */
export function ExpectedMark({ x, y }: { x: number; y: number }): VNode {
  return <path class="bs-expected" d={`M${x - 6} ${y}l6 -6l6 6l-6 6Z`} />;
}

/** A mark by itself, in front of a sentence of a list. */
export function ListMark({ weight }: { weight: Weight }): VNode {
  return (
    <svg class="bs-mark" width={14} height={14} aria-hidden="true">
      <Mark x={7} y={7} weight={weight} />
    </svg>
  );
}

/** The one pattern that means "unknown". */
export function HatchPattern(): VNode {
  return (
    <defs>
      <pattern
        id="bs-hatch"
        width={5}
        height={5}
        patternUnits="userSpaceOnUse"
        patternTransform="rotate(45)"
      >
        <line class="bs-hatch-line" x1={0} y1={0} x2={0} y2={5} />
      </pattern>
    </defs>
  );
}

/** Hatches a rectangle: not known here. */
export function Hatch(r: { x: number; y: number; width: number; height: number }): VNode {
  return <rect {...r} width={Math.max(0, r.width)} fill="url(#bs-hatch)" />;
}
