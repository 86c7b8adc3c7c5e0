import { DIGEST_START, mixOut } from "../judge/digest.ts";
import type { Plan } from "../judge/plan.ts";
import type { Input, Out } from "../judge/records.ts";
import { newOut, type State } from "../judge/state.ts";
import { step } from "../judge/step.ts";
import { EVENT_KINDS, type EventKind } from "../model/event.ts";

/** A recorded input: what the judge got, and by which bench file and controller it judged. */
export interface ReplayInput extends Input {
  /** Keys of the record; null before any controller introduced itself. */
  readonly benchFile: number;
  readonly manifest: number | null;
}

/** An event as the step tells it, without the words that are made from it. */
export interface ReplayedEvent {
  /** The input that made it. */
  readonly input: number;
  readonly kind: EventKind;
  /** Cause code, −1 − index of HAZARD_IDS, or NO_HAZARD, as in `Out`. */
  readonly hazard: number;
  readonly a: number;
  readonly b: number;
}

export interface Replayed {
  readonly inputs: number;
  /** Inputs that the record does not have, by the holes in their count. Above 0 it is no replay. */
  readonly missing: number;
  readonly events: readonly ReplayedEvent[];
  /** Digest of every outcome, as `mixOut` makes it, from DIGEST_START. */
  readonly digest: number;
}

/** The plan that a bench file and a manifest make; null where they do not go together. */
export type PlanFor = (benchFile: number, manifest: number) => Plan | null;

/**
 * Runs recorded inputs through the judge, from a state as the daemon began with. With the plans of
 * the record the events and the digest are those of that night; with others, what they would have
 * been. `state` is used up. The inputs are read once, in order; a reused record is fine.
 */
export function replay(inputs: Iterable<ReplayInput>, planFor: PlanFor, state: State): Replayed {
  const out = newOut();
  const events: ReplayedEvent[] = [];
  let plan: Plan | null = null;
  let benchFile = Number.NaN;
  let manifest: number | null = null;
  let count = 0;
  let last = 0;
  let digest = DIGEST_START;
  for (const input of inputs) {
    if (input.benchFile !== benchFile || input.manifest !== manifest) {
      benchFile = input.benchFile;
      manifest = input.manifest;
      plan = manifest === null ? null : planFor(benchFile, manifest);
    }
    step(plan, state, input, out);
    digest = mixOut(digest, out);
    collect(events, input.n, out);
    last = input.n;
    count++;
  }
  return { inputs: count, missing: last - count, events, digest };
}

function collect(events: ReplayedEvent[], input: number, out: Out): void {
  for (let i = 0; i < out.eventCount; i++) {
    events.push({
      input,
      kind: EVENT_KINDS[out.eventKind[i] as number] ?? "link",
      hazard: out.eventHazard[i] as number,
      a: out.eventA[i] as number,
      b: out.eventB[i] as number,
    });
  }
}
