import { signal } from "@preact/signals";

/** The two looks. "Dark" is the laser's word, so these are called day and night. */
export type Look = "day" | "night";
const KEY = "beamsitter-look";

const systemLook = (): Look =>
  matchMedia("(prefers-color-scheme: dark)").matches ? "night" : "day";

function keptLook(): Look | undefined {
  try {
    const kept = localStorage.getItem(KEY);
    return kept === "day" || kept === "night" ? kept : undefined;
  } catch {
    // Storage may be forbidden; the system's look is as good.
    return undefined;
  }
}

export const look = signal<Look>(keptLook() ?? systemLook());

/** Shows a look on the whole page. */
export function applyLook(): void {
  document.documentElement.dataset.look = look.value;
}

/** Changes to the other look and keeps it for this browser. */
export function otherLook(): void {
  look.value = look.value === "day" ? "night" : "day";
  applyLook();
  try {
    localStorage.setItem(KEY, look.value);
  } catch {
    // Kept for this visit only.
  }
}
