import type { EventLine } from "../control/api.ts";
import { FLAG, type Input, NO_HAZARD, type Out, STATE, STATES } from "../judge/records.ts";
import { eventWords } from "../judge/words.ts";
import { HAZARD_IDS } from "../model/bench.ts";
import { causeOf } from "../model/cause.ts";
import { type BenchEvent, EVENT_KINDS, type EventKind } from "../model/event.ts";
import type { LinkFact } from "../model/link-fact.ts";
import type { Manifest } from "../model/manifest.ts";
import type { SessionKind } from "../model/record-messages.ts";
import type { Wall_ms } from "../model/times.ts";
import { keepsTrouble, standsInTheWay, toldFact } from "./link-words.ts";
import type { LoopPorts } from "./ports.ts";

/**
 * Turns what the judge orders into what the recorder keeps and people read: events with their
 * words, the journal of inputs, and the beginnings and ends of sessions.
 */
export class Telling {
  readonly #bench: string;
  readonly #ports: LoopPorts;
  #nextId = 1;
  #session: SessionKind | "end" = "end";
  /** Warnings that stand now, by row, oldest first. */
  readonly warnings = new Map<string, { readonly words: string; readonly since: Wall_ms }>();
  /** What keeps this board from being used, in a sentence; empty where nothing does. */
  trouble = "";
  /** When the state last changed, wall ms. */
  since: Wall_ms;
  #state: number = STATE.offline;

  constructor(bench: string, ports: LoopPorts) {
    this.#bench = bench;
    this.#ports = ports;
    this.since = ports.wall();
  }

  /** Ids go on where the record left off. */
  startAfter(lastEventId: number): void {
    this.#nextId = lastEventId + 1;
  }

  /** An input other than a sample, kept in order. Samples travel in the ring. */
  journal(input: Input): void {
    this.#ports.record({
      kind: "journal",
      entry: {
        input: input.n,
        kind: input.kind,
        now_ms: input.now_ms,
        request: input.request,
        asker: input.asker,
        requestId: input.requestId,
        value: input.value,
        fact: input.fact,
        factValue: input.factValue,
      },
    });
  }

  /** A link fact: told where it is a person's business, and kept while it stands in the way. */
  link(fact: LinkFact, value: number, text: string, input: Input): void {
    const told = toldFact(fact, value, text);
    if (told !== null) this.say("link", fact, told.words, told.weight, input, value, 0);
    this.trouble = standsInTheWay(fact, text)
      ? (told?.words ?? "")
      : keepsTrouble(fact, this.trouble);
  }

  /** What a step said: its events, and the session it opens or ends. */
  outcome(out: Out, input: Input, rows: number, manifest: Manifest | null): void {
    for (let i = 0; i < out.eventCount; i++) this.#event(out, i, input);
    if (out.view.state !== this.#state) {
      this.#state = out.view.state;
      this.since = this.#ports.wall();
    }
    const session = sessionOf(out.view.state, out.view.flags, manifest !== null);
    if (session === this.#session) return;
    this.#session = session;
    this.#ports.record({ kind: "session", ringRow: rows, session, at: this.#ports.wall() });
  }

  #event(out: Out, i: number, input: Input): void {
    const kind = EVENT_KINDS[out.eventKind[i] as number] ?? "link";
    const hazard = out.eventHazard[i] as number;
    const a = out.eventA[i] as number;
    const b = out.eventB[i] as number;
    const told = eventWords(kind, hazard, a, b);
    const id = hazardId(hazard);
    if (kind === "warning" || kind === "unenforced")
      this.warnings.set(id, { words: told.words, since: this.#ports.wall() });
    if (kind === "warning-over") this.warnings.delete(id);
    this.say(kind, id, told.words, told.weight, input, a, b);
  }

  /** Numbers, words and weight of one event, to the recorder first and then to watchers. */
  say(
    kind: EventKind,
    hazard: string,
    words: string,
    weight: EventLine["weight"],
    input: Input | null,
    a: number,
    b: number,
  ): void {
    const wall = this.#ports.wall();
    const event: BenchEvent = {
      id: this.#nextId++,
      bench: this.#bench,
      input: input?.n ?? 0,
      tick: input !== null && input.kind === 0 ? input.sample.tick : -1,
      mono: this.#ports.now(),
      wall,
      kind,
      hazard,
      data: { a, b, words, weight },
    };
    this.#ports.record({ kind: "event", event });
    this.#ports.event({ id: event.id, at: wall, kind, hazard, weight, words }, event);
  }
}

const WATCHED = FLAG.watchOnly | FLAG.cutOff;

/** Which kind of session a state belongs to; armed to dark is one, dark while connected another. */
function sessionOf(state: number, flags: number, connected: boolean): SessionKind | "end" {
  const name = STATES[state];
  if ((flags & WATCHED) !== 0) return connected && name !== "offline" ? "watched" : "end";
  if (name === "armed" || name === "emitting") return "lit";
  return connected && name !== "offline" ? "dark" : "end";
}

/** Identifier of what an event is about: a cause, a row that only warns, or nothing. */
export function hazardId(code: number): string {
  if (code >= 0) return causeOf(code).id;
  return code === NO_HAZARD ? "" : (HAZARD_IDS[-1 - code] ?? "");
}
