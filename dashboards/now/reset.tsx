import type { VNode } from "preact";
import { useState } from "preact/hooks";
import { ask } from "./asking.ts";

/** The verb that clears a trip, naming its cause; a refusal stands beside it in words. */
export function ResetVerb({ text, cause }: { text: string; cause: string }): VNode {
  const [refusal, setRefusal] = useState("");
  const reset = async (): Promise<void> => {
    const answer = await ask("/api/reset", { cause });
    setRefusal(answer.ok ? "" : answer.words);
  };
  return (
    <>
      {" "}
      <button type="button" class="bs-verb" onClick={reset}>
        {text}
      </button>
      <span class="bs-refusal" role="status">
        {refusal}
      </span>
    </>
  );
}
