import type { VNode } from "preact";
import { useEffect, useState } from "preact/hooks";
import type { Snapshot, SwitchAnswer } from "../../daemon/desk/api.ts";
import { ampsAsMeant } from "../words/format.ts";
import { type Meant, readBack } from "./arming.ts";
import { ask } from "./asking.ts";

/** How long an answer stays under the field, ms. */
const ANSWER_ms = 15_000;

/** The form for a current: typed, read back, and repeated by the button that sends it. */
export function Arm({ now }: { now: Snapshot }): VNode {
  if (now.enforcement !== "permit") {
    return <p class="bs-arm">This bench takes no permits; light is not switched on from here.</p>;
  }
  if (now.state === "tripped") return <p class="bs-arm">Arming opens after the reset.</p>;
  if (now.state === "offline")
    return <p class="bs-arm">Arming opens when a controller is connected.</p>;
  return <Field now={now} />;
}

function Field({ now }: { now: Snapshot }): VNode {
  const [text, setText] = useState("");
  const [answer, setAnswer] = useState<SwitchAnswer | undefined>(undefined);
  const [busy, setBusy] = useState(false);
  const verb = now.state === "standby" ? "arm" : "set";
  const meant = readBack(text, now);
  // An answer is about the state it was given in, and not news for long.
  useEffect(() => {
    if (answer === undefined) return;
    const timer = setTimeout(() => setAnswer(undefined), ANSWER_ms);
    return () => clearTimeout(timer);
  }, [answer]);
  useEffect(() => setAnswer((old) => (old?.ok === true ? undefined : old)), [now.state]);
  const clear = (): void => setText("");
  const send = async (event: Event): Promise<void> => {
    event.preventDefault();
    if (meant.kind !== "meant" || busy) return;
    setBusy(true);
    const said = await ask(`/api/${verb}`, { current_mA: meant.current_mA });
    setBusy(false);
    setAnswer(said);
    if (said.ok) clear();
  };
  const type = (value: string): void => {
    setText(value);
    setAnswer(undefined);
  };
  return (
    <form class="bs-arm" onSubmit={send}>
      <label for="bs-current">
        {verb === "arm"
          ? "To arm, type the current you mean."
          : "Another current? Type the one you mean."}
      </label>
      <p class="bs-arm__line">
        <input
          id="bs-current"
          inputMode="decimal"
          autocomplete="off"
          placeholder="0.00"
          value={text}
          onInput={(event) => type(event.currentTarget.value)}
        />{" "}
        A
      </p>
      <Read meant={meant} answer={answer} />
      {meant.kind === "meant" && (
        <p class="bs-arm__act">
          <button type="submit" class="bs-go" disabled={busy}>
            {`${verb === "arm" ? "Arm at" : "Set"} ${ampsAsMeant(meant.current_mA)}`}
          </button>
          <button type="button" class="bs-verb" onClick={clear}>
            No
          </button>
        </p>
      )}
    </form>
  );
}

/** The typed current read back, or refused; then what the switch answered. */
function Read({ meant, answer }: { meant: Meant; answer: SwitchAnswer | undefined }): VNode {
  return (
    <div aria-live="polite">
      {meant.kind === "refused" && <p class="bs-read bs-read--refused">{meant.words}</p>}
      {meant.kind === "meant" && <p class="bs-read">{meant.words}</p>}
      {answer !== undefined && (
        <p class={answer.ok ? "bs-read" : "bs-read bs-read--refused"}>{answer.words}</p>
      )}
    </div>
  );
}
