import { join } from "node:path";
import { epochWords } from "../model/epoch.ts";
import { writeEpoch, writeReading } from "./by-hand.ts";
import { noteSent, SECOND_HOME } from "./influx-exported.ts";
import type { KeeperDone, KeeperRequest } from "./keeper-api.ts";
import { writeNote, writeTag } from "./notes.ts";
import { retire, ruleOf } from "./retention.ts";
import type { Store } from "./store.ts";
import { sweepArriving, unpack } from "./unpack.ts";
import type { Work } from "./work.ts";

/**
 * What people keep beside the samples: notes, tags, sessions from elsewhere. The recorder's thread
 * has one while a daemon runs; without a daemon a command opens the folder and makes its own.
 */
export class Keeper {
  readonly #store: Store;
  readonly #bench: string | null;
  readonly #wall_ms: () => number;

  /** @param bench whose notes these are where they name no session; null for the last session's */
  constructor(store: Store, bench: string | null, wall_ms: () => number = Date.now) {
    this.#store = store;
    this.#bench = bench;
    this.#wall_ms = wall_ms;
    sweepArriving(store);
  }

  /** Carries a request out, a short step at a time. Throws a RecordProblem where it cannot be. */
  *work(request: KeeperRequest): Work<KeeperDone> {
    switch (request.verb) {
      case "note":
        return this.#note(request);
      case "tag":
        return this.#tag(request);
      case "epoch":
        return this.#epoch(request);
      case "reading":
        return this.#reading(request);
      case "retire": {
        if (request.exportedTo === SECOND_HOME) noteSent(this.#store, this.#wall_ms());
        const rule = ruleOf(request.days, request.gigabytes, request.exportedTo);
        const retired = yield* retire(this.#store, this.#bench, rule, this.#wall_ms());
        return done(0, retired.words);
      }
      case "unpack": {
        const scratch = join(this.#store.folder, "arriving.sqlite");
        const session = yield* unpack(this.#store, request.file, scratch);
        return done(session, `It is session ${session} here.`);
      }
      default:
        return request satisfies never;
    }
  }

  #note(request: KeeperRequest & { verb: "note" }): KeeperDone {
    const { session, who, text, picture } = request;
    const id = writeNote(this.#store, {
      bench: this.#benchOf(session),
      wall_ms: request.wall_ms ?? this.#wall_ms(),
      session,
      who,
      text,
      picture: picture === null ? null : Buffer.from(picture, "base64"),
    });
    return done(id, `Note ${id} is kept.`);
  }

  #tag({ session, tag, does }: KeeperRequest & { verb: "tag" }): KeeperDone {
    const changed = writeTag(this.#store, session, tag, does);
    if (!changed)
      return done(0, does === "set" ? "It has that tag already." : "It has no such tag.");
    return done(
      0,
      `Session ${session} ${does === "set" ? "has" : "no longer has"} the tag ${tag}.`,
    );
  }

  #epoch({ verb: _verb, wall_ms, ...epoch }: KeeperRequest & { verb: "epoch" }): KeeperDone {
    const id = writeEpoch(this.#store, { ...epoch, at: wall_ms ?? this.#wall_ms() });
    return done(id, `A new epoch of the ${epoch.part} begins. ${epochWords(epoch)}`);
  }

  #reading({ verb: _verb, wall_ms, ...reading }: KeeperRequest & { verb: "reading" }): KeeperDone {
    const id = writeReading(this.#store, { ...reading, at: wall_ms ?? this.#wall_ms() });
    return done(id, `Reading ${id} is kept: ${reading.value} ${reading.unit}.`);
  }

  #benchOf(session: number | null): string {
    const found = this.#store.within((db) =>
      db
        .prepare(
          `SELECT bench FROM sessions WHERE @session IS NULL OR id = @session
           ORDER BY started_wall_ms DESC LIMIT 1`,
        )
        .pluck()
        .get({ session }),
    );
    if (session === null && this.#bench !== null) return this.#bench;
    return typeof found === "string" ? found : (this.#bench ?? "");
  }
}

const done = (id: number, words: string): KeeperDone => ({ kind: "done", id, words });
