/** What the person sees of the bench, and what the person asks: the words of the switch. */
interface Seen {
  readonly state: string;
  readonly ceiling_mA: number | null;
}
interface Asked {
  readonly verb: "arm";
  readonly current_mA: number;
  readonly asker: "scripted-person";
}

/** Current that the scripted person of bench "north" means, mA. */
export const SCRIPTED_mA = 1800;

/**
 * The person of the built-in bench: arms it when it stands by, and lowers the current where it is
 * refused as too high. Speaks to the switch like anybody; the switch refuses this person on any
 * other bench. Never resets a trip: that is left for whoever watches.
 */
export class ScriptedPerson {
  #asked = false;

  /** What to ask next, seeing that; null for nothing. */
  look(seen: Seen): Asked | null {
    if (this.#asked || seen.state !== "standby" || seen.ceiling_mA === null) return null;
    this.#asked = true;
    const current_mA = Math.min(SCRIPTED_mA, Math.floor(seen.ceiling_mA / 10) * 10);
    return { verb: "arm", current_mA, asker: "scripted-person" };
  }

  /** The answer to what was asked: a refusal is tried again at the next look. */
  told(ok: boolean): void {
    if (!ok) this.#asked = false;
  }
}
