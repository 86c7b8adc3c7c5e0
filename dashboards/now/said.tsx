import type { VNode } from "preact";
import { useEffect, useRef, useState } from "preact/hooks";
import type { Snapshot } from "../../daemon/desk/api.ts";
import { amps } from "../words/format.ts";
import { resetWords } from "../words/needs.ts";
import { type Piece, pieces } from "../words/pieces.ts";
import type { Sentences } from "../words/state.ts";
import { ResetVerb } from "./reset.tsx";

const CLASSES: Readonly<Record<Piece["kind"], string>> = {
  plain: "",
  ceiling: "bs-specimen bs-specimen--ceiling",
  floor: "bs-specimen bs-specimen--floor",
  current: "bs-specimen bs-specimen--current",
  warn: "bs-warn",
  trip: "bs-trip",
};

/** The state and what comes next, as two sentences; the legend of the picture is in the words. */
export function Said({ now, sentences }: { now: Snapshot; sentences: Sentences }): VNode {
  const { state, next, abnormal } = sentences;
  const tripped = now.state === "tripped" && abnormal === "";
  const shown = pieces(state, {
    current: abnormal === "" ? amps(now.current_mA) : "",
    cause: tripped ? (now.cause?.words ?? "") : "",
  });
  return (
    <div class="bs-two bs-say">
      <h1>
        {shown.map(({ text, kind }, i) => {
          const cut = i === 0 && abnormal !== "" && text.startsWith(abnormal) ? abnormal.length : 0;
          return (
            <>
              {cut > 0 && <span class="bs-warn">{text.slice(0, cut)}</span>}
              {kind === "plain" ? text.slice(cut) : <span class={CLASSES[kind]}>{text}</span>}
            </>
          );
        })}
      </h1>
      <p class="bs-next">
        {next}
        {tripped && now.cause !== null && (
          <ResetVerb text={resetWords(now.cause)} cause={now.cause.id} />
        )}
      </p>
    </div>
  );
}

/** Speaks a trip at once, whatever the screen reader is at; silent for one that stood before. */
export function TripAlert({ now }: { now: Snapshot }): VNode {
  const before = useRef(now.state);
  const [words, setWords] = useState("");
  useEffect(() => {
    if (now.state === "tripped" && before.current !== "tripped") setWords(now.sentence);
    if (now.state !== "tripped") setWords("");
    before.current = now.state;
  }, [now.state, now.sentence]);
  return (
    <p class="bs-heard-only" role="alert">
      {words}
    </p>
  );
}
