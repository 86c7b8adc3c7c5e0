import type { VNode } from "preact";
import { useMemo } from "preact/hooks";
import { Ahead } from "./ahead.tsx";
import { Events, Ticks } from "./events.tsx";
import { HatchPattern } from "./marks.tsx";
import { Notes } from "./notes.tsx";
import { Makers, Past } from "./past.tsx";
import type { Scene } from "./scene.ts";
import { Section } from "./section.tsx";
import { CaseStrip, OutputStrip, StripNames } from "./strips.tsx";

/**
 * The whole picture. What has happened is drawn anew only when it slides by a pixel or something
 * else than the newest sample changed (`pastKey`); the section at now with every snapshot.
 */
export function Picture(props: {
  scene: Scene;
  pastKey: string;
  cursorX: number | undefined;
}): VNode {
  const { scene, pastKey, cursorX } = props;
  const { width, height } = scene.layout;
  // The key says everything that the past depends on.
  const past = useMemo(
    () => (
      <g>
        <CaseStrip scene={scene} />
        <Past scene={scene} />
        <OutputStrip scene={scene} />
        <Ticks scene={scene} />
        <StripNames scene={scene} />
        <Makers scene={scene} />
        <Notes scene={scene} />
        <Events scene={scene} />
      </g>
    ),
    [pastKey],
  );
  return (
    <svg width={width} height={height} viewBox={`0 0 ${width} ${height}`} aria-hidden="true">
      <HatchPattern />
      {past}
      <Ahead scene={scene} />
      <Section scene={scene} />
      {cursorX !== undefined && (
        <path class="bs-line-ink" d={`M${cursorX} ${scene.layout.top}V${scene.layout.case[1]}`} />
      )}
    </svg>
  );
}
