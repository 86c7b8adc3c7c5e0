import { existsSync, rmSync } from "node:fs";
import { join } from "node:path";
import { makeCurve } from "../bench-file/curve.ts";
import { differences } from "../bench-file/describe.ts";
import { parseBench } from "../bench-file/parse.ts";
import { problemLines } from "../bench-file/report.ts";
import { ScriptedPerson } from "../bench-sim/scripted-person.ts";
import { SwitchClient } from "../control/client.ts";
import { JUDGE_VERSION } from "../judge/records.ts";
import type { Bench } from "../model/bench.ts";
import { Ring, ringBytes } from "../model/ring.ts";
import { RecorderClient } from "../record/client.ts";
import { RecordProblem } from "../record/problem.ts";
import { Supervision } from "../supervise.ts";
import { loadBench } from "./bench-text.ts";
import { DeskProcess } from "./desk-process.ts";
import { codeOf, EXIT, print, reasonOf, Trouble } from "./say.ts";
import { transportFor } from "./transports.ts";
import { dataFolder, isAlive, notices, removeNotice, socketPath, writeNotice } from "./where.ts";

export interface RunOptions {
  readonly file: string | URL;
  readonly folder: string | null;
  readonly port: string;
  /** Address where the page listens instead of this machine's own; null for its own. */
  readonly listen: string | null;
  readonly for_ms: number | null;
  readonly stayDark: boolean;
}

/** The ring holds a minute; a board that sends faster than this keeps less. */
const RING_RATE_MAX_perS = 250;
const RING_SECONDS = 60;
/** How long an ending daemon waits for the board to report dark, and for the disk, ms. */
const DARK_ms_MAX = 400;
const CLOSE_ms_MAX = 3000;

/** Causes that an ending daemon leaves behind. */
const BY_PERSON = 0;
const DAEMON_STOPPED = 85;
const HOST_DEFECT = 87;

/**
 * The daemon: reads files, takes locks, starts recorder and desk, and hands the judging thread its
 * ports. Resolves when it has ended; the bench is dark then.
 */
export async function runBench(options: RunOptions): Promise<void> {
  const port = portOf(options.port);
  const { bench, text } = loadBench(options.file);
  const folder = options.folder ?? dataFolder(bench.name);
  const socket = freeSocket(bench.name);
  const rows = Math.min(RING_RATE_MAX_perS, bench.controller.rate_perS * 2) * RING_SECONDS;
  const ring = new Ring(new SharedArrayBuffer(ringBytes(rows)));
  const recording = await startRecorder(folder, bench, text, ring);
  const end = new Ending();
  const desk: { process: DeskProcess | null } = { process: null };
  const supervision = await startSupervision(bench, ring, recording, socket, options, desk, end);
  end.onDefect(() => supervision.emergency(HOST_DEFECT));
  try {
    desk.process = new DeskProcess(
      {
        switchPath: socket,
        folder,
        host: options.listen ?? "127.0.0.1",
        port,
        darkPort: supervision.darkPort,
        tokenFile: join(folder, "token"),
        names: [],
        conversions: bench.conversions,
      },
      (words) => supervision.loop.telling.say("desk", "", words, "warn", null, 0, 0),
    );
    await desk.process.listening();
    writeNotice({
      bench: bench.name,
      pid: process.pid,
      socket,
      page: desk.process.address(),
      darkPort: supervision.darkPort,
      folder,
    });
    const address = desk.process.sign() ?? desk.process.address();
    print(`beamsitter watches ${bench.name}; its page: ${address}`);
    print(`The record is kept in ${folder}. Ctrl-C ends it and leaves the bench dark.`);
    if (bench.controller.transport.kind === "built-in" && !options.stayDark) {
      await bringPerson(socket);
    }
    const cause = await end.wait(options.for_ms);
    supervision.leave(cause);
    await until(DARK_ms_MAX, () => !isLit(supervision));
  } finally {
    supervision.close();
    desk.process?.close();
    removeNotice(bench.name);
    rmSync(socket, { force: true });
    await Promise.race([recording.client.close(), pause(CLOSE_ms_MAX)]);
  }
}

function portOf(text: string): number {
  const port = Number(text);
  if (Number.isInteger(port) && port >= 0 && port <= 65535) return port;
  throw new Trouble(`--port ${text} is no port.`, "Write a number from 0 to 65535.", EXIT.usage);
}

/** The switch's path, free: a daemon that lives on it is named, a dead one's leavings are removed. */
function freeSocket(bench: string): string {
  const path = socketPath(bench);
  const living = notices().find((n) => n.bench === bench && isAlive(n.pid));
  if (living !== undefined && existsSync(living.socket)) {
    throw new Trouble(
      `A daemon already runs bench "${bench}" (process ${living.pid}).`,
      `Use it (beamsitter status --on ${bench}), or end it first with Ctrl-C where it runs.`,
    );
  }
  rmSync(path, { force: true });
  return path;
}

interface Recording {
  readonly client: RecorderClient;
  readonly opened: Awaited<RecorderClient["opened"]>;
  /** The last words of the recorder, empty while all is well, and how far behind it was then. */
  readonly state: { words: string; behindRows: number };
}

async function startRecorder(
  folder: string,
  bench: Bench,
  benchText: string,
  ring: Ring,
): Promise<Recording> {
  const state = { words: "", behindRows: 0 };
  const client = new RecorderClient(
    { folder, bench: bench.name, benchText, judgeVersion: JUDGE_VERSION, ring: ring.memory },
    (message) => {
      if (message.kind === "state") {
        state.words = message.words;
        state.behindRows = ring.written - message.readRows;
      } else if (message.kind === "failed") {
        state.words = `${message.what} ${message.found} ${message.do}`;
      }
    },
  );
  try {
    return { client, opened: await client.opened, state };
  } catch (error) {
    if (error instanceof RecordProblem) {
      throw new Trouble(`${error.what} ${error.found}`, error.remedy);
    }
    throw error;
  }
}

async function startSupervision(
  bench: Bench,
  ring: Ring,
  recording: Recording,
  socket: string,
  options: RunOptions,
  desk: { readonly process: DeskProcess | null },
  end: Ending,
): Promise<Supervision> {
  try {
    return await Supervision.start({
      bench,
      transport: transportFor(bench),
      ring,
      latch: recording.opened.latch,
      lastEventId: recording.opened.lastEventId,
      socketPath: socket,
      darkHosts: darkHosts(options.listen),
      record: (message) => recording.client.post(message),
      recorder: () => ({
        behind_ms: (recording.state.behindRows * 1000) / bench.controller.rate_perS,
        words: recording.state.words,
      }),
      curve: makeCurve,
      read: (text) => {
        const parsed = parseBench(text);
        return parsed.ok
          ? { bench: parsed.bench, lines: [] }
          : { bench: null, lines: problemLines(parsed.problems, "bench file") };
      },
      differences,
      sign: () => desk.process?.sign() ?? null,
      adopted: (adopted) => desk.process?.adopt(adopted.conversions),
      stop: () => end.now(BY_PERSON),
    });
  } catch (error) {
    await recording.client.close();
    throw new Trouble(
      `The switch or the dark port cannot listen: ${reasonOf(error)} (${codeOf(error)}).`,
      "End what holds it, or set XDG_RUNTIME_DIR to a folder of your own.",
    );
  }
}

/** The dark port answers wherever the page does, and always on this machine. */
function darkHosts(listen: string | null): string[] {
  if (listen === null) return ["127.0.0.1"];
  return listen === "0.0.0.0" || listen === "::" ? [listen] : ["127.0.0.1", listen];
}

/** The built-in bench's person: a client of the switch like any other. */
async function bringPerson(socket: string): Promise<void> {
  const person = new ScriptedPerson();
  const client = await SwitchClient.connect(socket);
  await client.watch((push) => {
    if (push.push !== "snapshot") return;
    const question = person.look(push.snapshot);
    if (question === null) return;
    client.ask(question).then(
      (answer) => person.told(answer.ok),
      // The daemon ends: so does its person.
      () => client.close(),
    );
  });
}

const isLit = (s: Supervision): boolean => {
  const { state } = s.snapshot();
  return state === "armed" || state === "emitting";
};

const pause = (ms: number): Promise<void> => new Promise((resolve) => setTimeout(resolve, ms));

async function until(ms_max: number, done: () => boolean): Promise<void> {
  const end = performance.now() + ms_max;
  while (!done() && performance.now() < end) await pause(5);
}

/** What ends the daemon, and which cause it leaves: a person (0), or the system stopping it. */
class Ending {
  #resolve: (cause: number) => void = () => {};
  readonly #ended: Promise<number>;

  constructor() {
    this.#ended = new Promise((resolve) => {
      this.#resolve = resolve;
    });
    process.on("SIGINT", () => this.now(BY_PERSON));
    process.on("SIGTERM", () => this.now(DAEMON_STOPPED));
    process.on("SIGHUP", () => this.now(DAEMON_STOPPED));
  }

  now(cause: number): void {
    this.#resolve(cause);
  }

  /** A defect of ours: dark first, then the truth, then an end. */
  onDefect(dark: () => void): void {
    process.on("uncaughtException", (error) => {
      dark();
      process.stderr.write(`beamsitter found a defect of its own and went dark.\n${error.stack}\n`);
      process.exit(70);
    });
  }

  wait(for_ms: number | null): Promise<number> {
    if (for_ms !== null) setTimeout(() => this.now(BY_PERSON), for_ms);
    return this.#ended;
  }
}
