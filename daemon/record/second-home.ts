import type Database from "better-sqlite3";
import { nextFacts } from "./influx-facts.ts";
import { newPlace, type Place, type PlaceKeeper } from "./influx-place.ts";
import type { Point } from "./influx-points.ts";
import type { PointServer } from "./influx-server.ts";
import { type Batch, nextSamples, samplesOf } from "./influx-source.ts";
import { HomeTrouble } from "./influx-trouble.ts";

/** Points in one body: about 2 MB, and a second's work for a small server. */
const POINTS_MAX = 5000;
/** A line that fails is tried with fewer points at a time, down to this. */
const POINTS_MIN = 50;
/** Single points refused in one batch; more means that the server is not what it should be. */
const REFUSED_MAX = 8;

/** Opens the record for one look, and closes it. */
export type Look = <T>(work: (db: Database.Database) => T) => T;

/**
 * Carries the record to a server, in order, a batch at a time. It only reads the record, in short
 * transactions, so nothing here can hold up the recorder or the judge; while the server is away,
 * nothing happens but asking.
 */
export class SecondHome {
  readonly #look: Look;
  readonly #server: PointServer;
  readonly #keeper: PlaceKeeper;
  #place: Place;
  readonly #points_most: number;
  #points_max: number;
  #isPrepared = false;
  #words: readonly string[] = [];

  /** @param target address and database, by which a place is known to be of this server */
  constructor(
    look: Look,
    server: PointServer,
    keeper: PlaceKeeper,
    target: string,
    points_max = POINTS_MAX,
  ) {
    this.#points_most = points_max;
    this.#points_max = points_max;
    this.#look = look;
    this.#server = server;
    this.#keeper = keeper;
    const kept = keeper.load();
    this.#place = kept?.target === target ? kept : newPlace(target);
  }

  get place(): Place {
    return this.#place;
  }

  /** What was left out or could not be made, in sentences; empty while all is well. */
  get words(): string {
    return this.#words.join(" ");
  }

  /** Samples in the record that are not there yet. */
  get waiting(): number {
    return Math.max(0, this.#look(samplesOf) - this.#place.samples);
  }

  /** Sends the next batch. True where more is to be sent. Throws a HomeTrouble; calling again goes on. */
  async step(): Promise<boolean> {
    if (!this.#isPrepared) {
      this.#note(await this.#server.prepare());
      this.#isPrepared = true;
    }
    const batch = this.#look((db) => this.#next(db));
    if (batch === null) return false;
    try {
      const dropped = await this.#send(batch.points, { refused: 0 });
      this.#place = { ...batch.place, dropped: batch.place.dropped + dropped };
    } catch (error) {
      // The database may be gone, or the body too much for the line.
      this.#isPrepared = false;
      this.#points_max = Math.max(
        Math.min(POINTS_MIN, this.#points_most),
        Math.floor(this.#points_max / 2),
      );
      throw error;
    }
    this.#points_max = Math.min(this.#points_most, this.#points_max * 2);
    for (const words of batch.words) this.#note(words);
    this.#keeper.save(this.#place);
    return true;
  }

  #next(db: Database.Database): Batch | null {
    const { precision } = this.#server;
    return (
      nextSamples(db, this.#place, precision, this.#points_max) ??
      nextFacts(db, this.#place, precision)
    );
  }

  /** Writes points, in halves where they are too many or one of them is refused. Counts the dropped. */
  async #send(points: readonly Point[], seen: { refused: number }): Promise<number> {
    try {
      const { dropped, words } = await this.#server.write(points);
      if (dropped > 0) this.#note(`${dropped} points were not kept there: ${words}.`);
      return dropped;
    } catch (error) {
      if (!(error instanceof HomeTrouble) || error.kind === "later") throw error;
      if (points.length > 1) {
        const half = Math.ceil(points.length / 2);
        const before = await this.#send(points.slice(0, half), seen);
        return before + (await this.#send(points.slice(half), seen));
      }
      seen.refused++;
      if (seen.refused > REFUSED_MAX) throw new HomeTrouble("later", error.message);
      this.#note(`A point was left out. ${error.message}`);
      return 1;
    }
  }

  /** Keeps the newest few sentences, each once. */
  #note(words: string): void {
    if (words === "") return;
    this.#words = [...this.#words.filter((known) => known !== words), words].slice(-3);
  }
}
