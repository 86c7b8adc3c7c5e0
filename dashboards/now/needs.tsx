import type { VNode } from "preact";
import type { Snapshot } from "../../daemon/desk/api.ts";
import { ListMark } from "../picture/marks.tsx";
import { type Need, needsOf, promise } from "../words/needs.ts";
import { ResetVerb } from "./reset.tsx";

/** What wants somebody, worst first, each with at most one verb. */
export function Needs({ now, silence_ms }: { now: Snapshot; silence_ms: number }): VNode {
  const needs = needsOf(now, silence_ms);
  return (
    <section class="bs-needs">
      <h2>{needs.length === 0 ? "Nothing needs you." : "Needs you, worst first"}</h2>
      <ol>
        {needs.map((need) => (
          <li key={need.key}>
            <ListMark weight={need.weight} />
            <NeedWords need={need} />
          </li>
        ))}
      </ol>
    </section>
  );
}

const CLASSES = { calm: "", warn: "bs-warn", trip: "bs-trip" } as const;

/** The first sentence carries the colour; the rest and the verb are plain. */
function NeedWords({ need }: { need: Need }): VNode {
  const end = need.words.indexOf(". ");
  const first = end < 0 ? need.words : need.words.slice(0, end + 1);
  return (
    <p>
      <span class={CLASSES[need.weight]}>{first}</span>
      {need.words.slice(first.length)}
      {need.verb !== undefined && <ResetVerb {...need.verb} />}
    </p>
  );
}

/** What the bench does by itself when everybody has left. */
export function Leaving({ now }: { now: Snapshot }): VNode {
  return (
    <section>
      <h2>If you leave it</h2>
      <p class="bs-small">{promise(now).join(" ")}</p>
    </section>
  );
}
