import type { VNode } from "preact";
import { useEffect } from "preact/hooks";
import { confirmedAt } from "../words/dark.ts";
import { dayAndZone } from "../words/format.ts";
import { sentencesOf } from "../words/state.ts";
import { Arm } from "./arm.tsx";
import { DarkBlock, DarkSentence, darkAsked } from "./dark.tsx";
import { Figure } from "./figure.tsx";
import { Leaving, Needs } from "./needs.tsx";
import { Said, TripAlert } from "./said.tsx";
import { signedOut, silence_ms, snapshot } from "./state.ts";
import { look, otherLook } from "./theme.ts";

/** The Now page: one bench, as it is. */
export function NowPage(): VNode {
  const now = snapshot.value;
  return (
    <>
      <DarkBlock />
      <header class="bs-top">
        <span class="bs-top__bench">{now?.bench ?? ""}</span>
        <span aria-current="page">Now</span>
        <span>{now === undefined ? "" : dayAndZone(now.at)}</span>
        <button type="button" class="bs-verb bs-top__look" onClick={otherLook}>
          {look.value === "day" ? "Night" : "Day"}
        </button>
      </header>
      <main>
        <DarkSentence />
        {now === undefined ? <Nothing /> : <Bench />}
      </main>
    </>
  );
}

/** Before the first word from the desk. */
function Nothing(): VNode {
  const words = signedOut.value
    ? "This page is not signed in. Run beamsitter open on the bench's computer, and open the address it prints."
    : "Nothing heard yet. This page asks every 2\u00a0s.";
  return (
    <div class="bs-two bs-say">
      <h1>{words}</h1>
    </div>
  );
}

function Bench(): VNode | null {
  const now = snapshot.value;
  const title = now === undefined ? "beamsitter" : `${now.bench}, ${now.state}`;
  const silent = silence_ms.value > 0 || signedOut.value;
  useEffect(() => {
    document.title = silent ? `${now?.bench ?? ""}, not heard` : title;
  }, [title, silent]);
  const armed = now?.state === "armed";
  useEffect(() => {
    // A new arming makes the last dark history.
    if (armed) darkAsked.value = undefined;
  }, [armed]);
  if (now === undefined) return null;
  const dark_at = darkAsked.value === undefined ? undefined : confirmedAt(darkAsked.value);
  const sentences = sentencesOf(now, {
    silence_ms: silence_ms.value,
    signedOut: signedOut.value,
    dark_at,
  });
  return (
    <>
      <TripAlert now={now} />
      <Said now={now} sentences={sentences} />
      <Figure now={now} label={`${sentences.state} ${sentences.next}`} />
      <div class="bs-two bs-low">
        <Needs now={now} silence_ms={silence_ms.value} />
        <div>
          <Leaving now={now} />
          <Arm now={now} />
          <p class="bs-law">{now.safety}</p>
        </div>
      </div>
    </>
  );
}
