import type { EventLine } from "../control/api.ts";
import { causeById } from "../model/cause.ts";
import type { BenchEvent, EventKind } from "../model/event.ts";

/** What of a recorded event the pages need. */
export type EventSource = Pick<BenchEvent, "id" | "wall" | "kind" | "hazard" | "data">;

const WEIGHTS: Readonly<Partial<Record<EventKind, EventLine["weight"]>>> = {
  trip: "trip",
  warning: "warn",
  capped: "warn",
};

const isWeight = (value: unknown): value is EventLine["weight"] =>
  value === "calm" || value === "warn" || value === "trip";

/**
 * A recorded event as pages get it. Words and weight were recorded with it; an event of a record
 * that has none (imported, or older) is told by its kind and cause.
 */
export function eventLine(event: EventSource): EventLine {
  const { words, weight } = event.data;
  const about = causeById(event.hazard)?.words ?? event.hazard;
  return {
    id: event.id,
    at: event.wall,
    kind: event.kind,
    hazard: event.hazard,
    weight: isWeight(weight) ? weight : (WEIGHTS[event.kind] ?? "calm"),
    words:
      typeof words === "string" ? words : about === "" ? event.kind : `${event.kind}: ${about}`,
  };
}
