import type { VNode } from "preact";
import { useEffect, useRef, useState } from "preact/hooks";
import type { Snapshot } from "../../daemon/desk/api.ts";
import { timeAt, xAt } from "../picture/columns.ts";
import { layoutFor } from "../picture/layout.ts";
import { Picture } from "../picture/picture.tsx";
import { SPANS_min, spanFor } from "../picture/scale.ts";
import { type Scene, sceneOf } from "../picture/scene.ts";
import { cursorSentence } from "../words/cursor.ts";
import { keepUnits } from "../words/format.ts";
import { chosenSpan_min, cursor_at, events, staleWords, track } from "./state.ts";

/** With reduced motion the past moves in steps of this length, ms. */
const STEP_ms = 10_000;
const reduced = matchMedia("(prefers-reduced-motion: reduce)");

/** Size of the page, followed as it changes. */
function useSize(): { width: number; height: number } {
  const read = (): { width: number; height: number } => ({
    width: document.documentElement.clientWidth,
    height: innerHeight,
  });
  const [size, setSize] = useState(read);
  useEffect(() => {
    const watcher = new ResizeObserver(() => setSize(read()));
    watcher.observe(document.documentElement);
    return () => watcher.disconnect();
  }, []);
  return size;
}

function sceneNow(now: Snapshot, size: { width: number; height: number }): Scene {
  const at = reduced.matches ? Math.floor(now.at / STEP_ms) * STEP_ms : now.at;
  const first = track.rows[0]?.t ?? now.at;
  return sceneOf({
    layout: layoutFor(size.width, size.height),
    rows: track.rows,
    span_min: chosenSpan_min.value ?? spanFor(now.at - first),
    now: { ...now, at },
    events: events.value,
    stale: staleWords.value,
  });
}

/** Everything that the drawing of the past depends on, as one text. */
function keyOf({ axis, layout, bounds, now, stale, events: seen }: Scene): string {
  const last = seen[seen.length - 1]?.id;
  const size = `${layout.width} ${layout.height}`;
  const scale = `${axis.now} ${axis.msPerPx} ${bounds.low} ${bounds.high}`;
  return `${size} ${scale} ${track.version} ${now.state} ${last} ${seen.length} ${stale === ""}`;
}

/** How far the keys move the cursor, px. */
const MOVES: Readonly<Record<string, number>> = {
  ArrowLeft: -4,
  ArrowRight: 4,
  PageUp: -60,
  PageDown: 60,
  Home: Number.NEGATIVE_INFINITY,
  End: Number.POSITIVE_INFINITY,
};

function onKey(event: KeyboardEvent, scene: Scene): void {
  const move = MOVES[event.key];
  const zoom = { "+": -1, "=": -1, "-": 1, "\u2212": 1 }[event.key];
  if (event.key === "Escape") cursor_at.value = undefined;
  if (move !== undefined) {
    event.preventDefault();
    const from = cursor_at.value === undefined ? scene.axis.x0 : xAt(scene.axis, cursor_at.value);
    cursor_at.value = timeAt(scene.axis, Math.min(scene.axis.x0, Math.max(0, from + move)));
  }
  if (zoom !== undefined) {
    event.preventDefault();
    const span = Math.round((scene.axis.msPerPx * scene.axis.x0) / 60_000);
    const next = SPANS_min.indexOf(span as (typeof SPANS_min)[number]) + zoom;
    chosenSpan_min.value = SPANS_min[Math.min(SPANS_min.length - 1, Math.max(0, next))];
  }
}

/** The row nearest to a moment; undefined where the record is empty. */
const rowAt = (at: number) => {
  const i = track.rows.findIndex((row) => row.t >= at);
  return track.rows[i < 0 ? track.rows.length - 1 : i];
};

/** The picture with its cursor, and under its axis what the cursor reads. */
export function Figure({ now, label }: { now: Snapshot; label: string }): VNode {
  const scene = sceneNow(now, useSize());
  const at = cursor_at.value;
  const x = at === undefined ? undefined : Math.round(xAt(scene.axis, at));
  const row = at === undefined ? undefined : rowAt(at);
  const held = useRef(false);
  const point = (event: PointerEvent): void => {
    if (event.clientX < scene.layout.g0) cursor_at.value = timeAt(scene.axis, event.clientX);
    else if (!held.current) cursor_at.value = undefined;
  };
  const leave = (): void => {
    if (!held.current) cursor_at.value = undefined;
  };
  return (
    <>
      <figure
        class="bs-picture"
        role="img"
        // biome-ignore lint/a11y/noNoninteractiveTabindex: arrow keys move the cursor over it
        tabIndex={0}
        aria-label={label}
        aria-describedby="bs-cursor"
        onPointerMove={point}
        onPointerLeave={leave}
        onKeyDown={(event) => onKey(event, scene)}
        onFocus={() => {
          held.current = true;
        }}
        onBlur={() => {
          held.current = false;
          cursor_at.value = undefined;
        }}
      >
        <Picture
          scene={scene}
          pastKey={keyOf(scene)}
          cursorX={x !== undefined && x >= 0 ? x : undefined}
        />
      </figure>
      <p id="bs-cursor" class="bs-cursor" aria-live="polite">
        {row === undefined ? "" : keepUnits(cursorSentence(row))}
      </p>
    </>
  );
}
