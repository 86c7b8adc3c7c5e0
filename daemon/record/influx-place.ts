import { closeSync, fsyncSync, openSync, readFileSync, renameSync, writeSync } from "node:fs";
import { dirname, join } from "node:path";
import { NO_STAMP, type StampState } from "./influx-stamps.ts";
import { errorCode } from "./problem.ts";

/** How far one run of the record has been sent. */
export interface RunPlace {
  /** Last of the judge's inputs that is a sample the server has. */
  readonly input: number;
  readonly stamps: StampState;
}

/**
 * How far the record has been sent. The record itself is the spool: nothing is stored a second time
 * while a server is away, and this place is all that is kept beside it. It is moved on only after the
 * server has confirmed, and points are idempotent, so any interruption at most sends some again.
 */
export interface Place {
  readonly version: 1;
  /** Address and database; another one is sent everything from the start. */
  readonly target: string;
  /** By the run's id, of the newest runs. */
  readonly runs: Readonly<Record<string, RunPlace>>;
  /** Runs up to this one are sent whole. */
  readonly runsDone: number;
  /** Session and manifest whose texts were sent last. */
  readonly texts: string;
  readonly event: number;
  readonly gap: number;
  readonly note: number;
  readonly epoch: number;
  readonly reading: number;
  /** Sessions up to this one were sent as they ended; later ones by id, as they were sent last. */
  readonly sessionsDone: number;
  readonly sessions: Readonly<Record<string, string>>;
  /** Samples behind this place: sent, or lost. */
  readonly samples: number;
  /** Samples that could not be sent: their block is damaged, or retention took it before. */
  readonly lost: number;
  /** Points the server did not keep, and values that are no whole numbers. */
  readonly dropped: number;
}

export const newPlace = (target: string): Place => ({
  version: 1,
  target,
  runs: {},
  runsDone: 0,
  texts: "",
  event: 0,
  gap: 0,
  note: 0,
  epoch: 0,
  reading: 0,
  sessionsDone: 0,
  sessions: {},
  samples: 0,
  lost: 0,
  dropped: 0,
});

export const RUN_START: RunPlace = { input: -1, stamps: NO_STAMP };

/** Where a place is kept; a test has its own. */
export interface PlaceKeeper {
  load(): Place | null;
  /** Durable when it returns. */
  save(place: Place): void;
}

/** The place as a file of the data folder. */
export const placeFile = (folder: string): string => join(folder, "second-home.json");

/**
 * A file that is replaced as a whole. One that is damaged or of another version is no place: all is
 * sent again then, which changes nothing at the server.
 */
export class PlaceFile implements PlaceKeeper {
  readonly #file: string;

  constructor(file: string) {
    this.#file = file;
  }

  load(): Place | null {
    try {
      const place = JSON.parse(readFileSync(this.#file, "utf8")) as Place;
      return place.version === 1 ? { ...newPlace(place.target), ...place } : null;
    } catch (error) {
      if (error instanceof SyntaxError || errorCode(error) === "ENOENT") return null;
      throw error;
    }
  }

  save(place: Place): void {
    const fresh = `${this.#file}.new`;
    const handle = openSync(fresh, "w", 0o600);
    try {
      writeSync(handle, JSON.stringify(place));
      fsyncSync(handle);
    } finally {
      closeSync(handle);
    }
    renameSync(fresh, this.#file);
    const folder = openSync(dirname(this.#file), "r");
    try {
      fsyncSync(folder);
    } finally {
      closeSync(folder);
    }
  }
}
