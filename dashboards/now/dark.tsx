import { signal } from "@preact/signals";
import type { VNode } from "preact";
import { useEffect } from "preact/hooks";
import { darkWords } from "../words/dark.ts";
import { type DarkAsked, goDark } from "./going-dark.ts";

export const darkAsked = signal<DarkAsked | undefined>(undefined);
let presses = 0;

/** Where the second way listens, from the page itself: known also when the desk is not. */
function darkPortAddress(): string {
  const meta = document.querySelector<HTMLMetaElement>('meta[name="beamsitter-dark-port"]');
  const port = Number(meta?.content);
  return port > 0 ? `http://${location.hostname}:${port}/dark` : "";
}

/** Asks for dark, both ways at once. Never waits, never asks back, may be called again any time. */
function askDark(): void {
  const post = (address: string, way: AbortSignal): Promise<Response> =>
    fetch(address, { method: "POST", signal: way, keepalive: true });
  const ways = { desk: "/api/dark", port: darkPortAddress() };
  presses++;
  const mine = presses;
  void goDark(ways, post, Date.now, (state) => {
    // Of two presses the later one is shown.
    if (mine === presses) darkAsked.value = state;
  });
}

const isField = (target: EventTarget | null): boolean =>
  target instanceof Element && target.closest("input, textarea, select") !== null;

function onKey(event: KeyboardEvent): void {
  if (event.key === "Escape" && document.activeElement instanceof HTMLElement) {
    document.activeElement.blur();
  }
  const plain = !event.ctrlKey && !event.metaKey && !event.altKey && !event.repeat;
  if (event.key.toLowerCase() === "d" && plain && !isField(event.target)) {
    event.preventDefault();
    askDark();
  }
}

/** The only filled block on the page. */
export function DarkBlock(): VNode {
  useEffect(() => {
    addEventListener("keydown", onKey);
    return () => removeEventListener("keydown", onKey);
  }, []);
  const asked = darkAsked.value;
  return (
    <button type="button" class="bs-dark" onClick={askDark} aria-keyshortcuts="d">
      Dark{" "}
      <small class={asked === undefined ? "bs-dark__key" : ""}>
        {asked === undefined ? "or press d" : darkWords(asked).block}
      </small>
    </button>
  );
}

/** The whole sentence of who confirmed dark, for eyes and for screen readers. */
export function DarkSentence(): VNode {
  const asked = darkAsked.value;
  return (
    <p class="bs-dark-said" role="status">
      {asked === undefined ? "" : darkWords(asked).sentence}
    </p>
  );
}
