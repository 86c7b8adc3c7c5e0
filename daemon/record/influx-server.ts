import { readFileSync } from "node:fs";
import { InfluxDB } from "influx";
import type { InfluxPart } from "../model/bench.ts";
import { readCredentials } from "./influx-credentials.ts";
import type { Point } from "./influx-points.ts";
import type { Precision } from "./influx-stamps.ts";
import { HomeTrouble, partlyDropped, troubleOf } from "./influx-trouble.ts";
import { errorCode } from "./problem.ts";

/** Retention policy that is made where the bench file says how long to keep. */
export const POLICY = "beamsitter";

/** Points a server did not keep out of a body it otherwise took, and what it said of them. */
export interface Taken {
  readonly dropped: number;
  readonly words: string;
}

/** Where points go; `InfluxServer` is one, a test has its own. */
export interface PointServer {
  readonly precision: Precision;
  /** Makes database and retention policy where they are missing and that is allowed. Says what it could not do. */
  prepare(): Promise<string>;
  /** Resolves when the server has kept them. Throws a HomeTrouble. */
  write(points: readonly Point[]): Promise<Taken>;
}

/** Longest wait for an answer, to its last byte. */
const ANSWER_ms_MAX = 20_000;

/** The package pauses a server after a fault by itself; here whoever asks decides when to ask again. */
const NO_PAUSE = {
  getDelay: () => 0,
  next: () => NO_PAUSE,
  reset: () => NO_PAUSE,
};

/** One server and database, through the `influx` package. */
export class InfluxServer implements PointServer {
  readonly part: InfluxPart;
  readonly #credentialsFile: string;
  readonly #answer_ms_max: number;

  /** @param credentialsFile used where the bench file names none */
  constructor(part: InfluxPart, credentialsFile: string, answer_ms_max = ANSWER_ms_MAX) {
    this.part = part;
    this.#credentialsFile = part.credentialsFile ?? credentialsFile;
    this.#answer_ms_max = answer_ms_max;
  }

  get precision(): Precision {
    return this.part.server === "victoria-metrics" ? "ms" : "n";
  }

  /** The samples' retention policy; undefined for the database's own. */
  get policy(): string | undefined {
    return this.part.keep_ms === null || this.part.server !== "influxdb" ? undefined : POLICY;
  }

  async prepare(): Promise<string> {
    if (this.part.server !== "influxdb") return "";
    const { database, keep_ms } = this.part;
    try {
      await this.#ask((influx) => influx.createDatabase(database));
      if (keep_ms === null) return "";
      return await this.#preparePolicy(keep_ms);
    } catch (error) {
      const trouble = this.#trouble(error);
      // Who may only write need not be able to make anything; a missing database shows in writing.
      return `Database and retention policy could not be made: ${trouble.message}`;
    }
  }

  async #preparePolicy(keep_ms: number): Promise<string> {
    const { database } = this.part;
    const hours = Math.ceil(keep_ms / 3_600_000);
    const policies = await this.#ask((influx) => influx.showRetentionPolicies(database));
    const there = policies.find((policy) => policy.name === POLICY);
    if (there === undefined) {
      const duration = `${hours}h`;
      await this.#ask((influx) =>
        influx.createRetentionPolicy(POLICY, {
          database,
          duration,
          replication: 1,
          isDefault: false,
        }),
      );
      return "";
    }
    if (there.duration === `${hours}h0m0s`) return "";
    // Shortening it would delete what another bench keeps there: a person decides that.
    return `The retention policy ${POLICY} keeps ${there.duration}, the bench file asks for ${hours}h. Change one of them: ALTER RETENTION POLICY "${POLICY}" ON "${database}" DURATION ${hours}h.`;
  }

  async write(points: readonly Point[]): Promise<Taken> {
    const { database } = this.part;
    const retentionPolicy = this.policy;
    const options = {
      database,
      precision: this.precision,
      ...(retentionPolicy === undefined ? {} : { retentionPolicy }),
    };
    try {
      await this.#ask((influx) => influx.writePoints([...points], options));
      return { dropped: 0, words: "" };
    } catch (error) {
      const partly = partlyDropped(error);
      if (partly !== null) return partly;
      throw this.#trouble(error);
    }
  }

  /** Rows of one query, as columns and values of each series. Throws a HomeTrouble, or the signal's reason. */
  async query(
    text: string,
    epoch: "ms" | "iso",
    signal?: AbortSignal,
  ): Promise<readonly AnsweredSeries[]> {
    const { database } = this.part;
    const options = {
      database,
      ...(epoch === "ms" ? { precision: "ms" as const } : {}),
      ...(signal === undefined ? {} : { signal }),
    };
    try {
      const answer = (await this.#ask((influx) => influx.queryRaw(text, options))) as Answered;
      const [result] = answer.results;
      if (result?.error !== undefined) throw new HomeTrouble("later", this.#said(result.error));
      return result?.series ?? [];
    } catch (error) {
      signal?.throwIfAborted();
      throw this.#trouble(error);
    }
  }

  #said = (words: string): string => `${this.part.url} does not answer the question: ${words}.`;

  #trouble(error: unknown): HomeTrouble {
    return troubleOf(error, this.part);
  }

  /**
   * One question through a client of its own: credentials and certificate are read anew, so that
   * mending them needs no restart. The package waits for ever for the end of an answer that was cut
   * short, so each question has an end of its own.
   */
  async #ask<T>(question: (influx: InfluxDB) => Promise<T>): Promise<T> {
    const influx = this.#client();
    let timer: NodeJS.Timeout | undefined;
    const late = new Promise<never>((_, reject) => {
      const words = `${this.part.url} began an answer and did not end it within ${this.#answer_ms_max / 1000} s. It is asked again.`;
      timer = setTimeout(() => reject(new HomeTrouble("later", words)), this.#answer_ms_max);
    });
    try {
      return await Promise.race([question(influx), late]);
    } finally {
      clearTimeout(timer);
    }
  }

  #client(): InfluxDB {
    const { url, database, caFile } = this.part;
    const { protocol, hostname, port, pathname } = new URL(url);
    const isTls = protocol === "https:";
    const credentials = readCredentials(this.#credentialsFile);
    return new InfluxDB({
      database,
      ...(credentials === null
        ? {}
        : { username: credentials.user, password: credentials.password }),
      hosts: [
        {
          host: hostname,
          port: port === "" ? (isTls ? 443 : 80) : Number(port),
          protocol: isTls ? "https" : "http",
          path: pathname === "/" ? "" : pathname.replace(/\/$/, ""),
          options: caFile === null ? {} : { ca: readAuthority(caFile) },
        },
      ],
      pool: { maxRetries: 0, requestTimeout: this.#answer_ms_max, backoff: NO_PAUSE },
    });
  }
}

interface Answered {
  readonly results: readonly {
    readonly series?: readonly AnsweredSeries[];
    readonly error?: string;
  }[];
}

export interface AnsweredSeries {
  readonly name: string;
  readonly tags?: Readonly<Record<string, string>>;
  readonly columns: readonly string[];
  readonly values: readonly (readonly (number | string | null)[])[];
}

function readAuthority(file: string): Buffer {
  try {
    return readFileSync(file);
  } catch (error) {
    throw new HomeTrouble(
      "later",
      `The certificate file ${file} cannot be read (${errorCode(error)}). Mend its place in the bench file, ca-file.`,
    );
  }
}
