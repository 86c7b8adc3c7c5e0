import { rmSync } from "node:fs";
import { join } from "node:path";
import { makeCurve } from "../bench-file/curve.ts";
import { differences } from "../bench-file/describe.ts";
import { parseBench } from "../bench-file/parse.ts";
import { problemLines } from "../bench-file/report.ts";
import { ScriptedPerson } from "../bench-sim/scripted-person.ts";
import { SwitchClient } from "../control/client.ts";
import type { Bench } from "../model/bench.ts";
import { Ring, ringBytes } from "../model/ring.ts";
import { enforcementOf } from "../model/stream.ts";
import { Supervision } from "../supervise.ts";
import { addressTrouble, darkHosts, wantPort } from "./addresses.ts";
import { loadBench } from "./bench-text.ts";
import { DeskProcess } from "./desk-process.ts";
import { BY_PERSON, Ending, HOST_DEFECT } from "./ending.ts";
import { type Recording, startRecorder, startSecondHome } from "./recording.ts";
import { codeOf, resetWords, Trouble } from "./say.ts";
import { Telling } from "./telling.ts";
import { transportFor } from "./transports.ts";
import { beganAt, dataFolder, freeSocket, removeNotice, writeNotice } from "./where.ts";
import { startWitnesses } from "./witnesses.ts";

export interface RunOptions {
  readonly file: string | URL;
  readonly folder: string | null;
  /** Port of the page; 0 takes a free one. */
  readonly port: number;
  /** Address where the page listens instead of this machine's own; null for its own. */
  readonly listen: string | null;
  readonly for_ms: number | null;
  readonly stayDark: boolean;
  readonly json: boolean;
}

/** The ring holds a minute; a board that sends faster than this keeps less. */
const RING_RATE_MAX_perS = 250;
const RING_SECONDS = 60;
/** How long an ending daemon waits for the board to report dark, for the disk, and to be read, ms. */
const DARK_ms_MAX = 400;
const CLOSE_ms_MAX = 3000;
const SHOWN_ms_MAX = 300;

/** What a daemon is made of while it starts. */
interface Parts {
  readonly bench: Bench;
  readonly ring: Ring;
  readonly recording: Recording;
  readonly socket: string;
  readonly folder: string;
  readonly telling: Telling;
  readonly end: Ending;
  desk: DeskProcess | null;
  endWitnesses: () => void;
}

/**
 * The daemon: reads files, takes locks, starts recorder and desk, and hands the judging thread its
 * ports. Resolves when it has ended; the bench is dark then.
 */
export async function runBench(options: RunOptions): Promise<void> {
  const { bench, text, hints } = loadBench(options.file);
  const host = options.listen ?? "127.0.0.1";
  const socket = await freeSocket(bench.name);
  if (options.port !== 0 || options.listen !== null) await wantPort(host, options.port);
  const folder = options.folder ?? dataFolder(bench.name);
  const rows = Math.min(RING_RATE_MAX_perS, bench.controller.rate_perS * 2) * RING_SECONDS;
  const ring = new Ring(new SharedArrayBuffer(ringBytes(rows)));
  const recording = await startRecorder(folder, bench, text, ring);
  const telling = new Telling(options.json);
  const end = new Ending(() => telling.note(NOT_SUSPENDED));
  const made = { bench, ring, recording, socket, folder, telling, end };
  const parts: Parts = { ...made, desk: null, endWitnesses: () => {} };
  const supervision = await startSupervision(parts, options);
  end.onDefect(() => supervision.emergency(HOST_DEFECT));
  const sayRecord = (words: string, weight: "calm" | "warn"): void =>
    supervision.loop.telling.say("record", "", words, weight, null, 0, 0);
  const secondHome = startSecondHome(folder, bench, sayRecord);
  try {
    parts.desk = await startDesk(parts, supervision, host, options.port);
    const scripted = bench.controller.transport.kind === "built-in" && !options.stayDark;
    announce(parts, parts.desk, supervision, firstWords(supervision, hints, scripted));
    const work = { bench: bench.name, folder, witnesses: bench.witnesses ?? [] };
    parts.endWitnesses = startWitnesses(work, (words) => sayRecord(words, "calm"));
    if (scripted) await bringPerson(socket);
    supervision.leave(await end.wait(options.for_ms));
    await until(DARK_ms_MAX, () => !isLit(supervision));
    telling.ended(lastWords(bench, supervision));
  } finally {
    supervision.close();
    parts.endWitnesses();
    parts.desk?.close();
    removeNotice(bench.name);
    rmSync(socket, { force: true });
    await Promise.race([recording.client.close(), pause(CLOSE_ms_MAX)]);
    await secondHome?.close();
    await until(SHOWN_ms_MAX, () => telling.isShown);
    telling.close();
  }
}

const NOT_SUSPENDED =
  "Ctrl-Z is not obeyed: a judge that stands still ends the light. Ctrl-C ends the daemon.";

async function startSupervision(parts: Parts, options: RunOptions): Promise<Supervision> {
  const { bench, ring, recording, socket, telling, end } = parts;
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
      sign: () => parts.desk?.sign() ?? null,
      adopted: (adopted) => parts.desk?.adopt(adopted.conversions),
      event: (line) => telling.event(line),
      stop: () => end.now(BY_PERSON),
    });
  } catch (error) {
    await recording.client.close();
    if ((error as { address?: unknown }).address !== socket) {
      throw addressTrouble(error, options.listen ?? "127.0.0.1", 0);
    }
    throw new Trouble(
      `The switch cannot listen on ${socket} (${codeOf(error)}).`,
      "End the daemon that has it, or set XDG_RUNTIME_DIR to a folder of your own.",
    );
  }
}

async function startDesk(
  { bench, socket, folder }: Parts,
  supervision: Supervision,
  host: string,
  port: number,
): Promise<DeskProcess> {
  const config = {
    switchPath: socket,
    folder,
    host,
    port,
    darkPort: supervision.darkPort,
    tokenFile: join(folder, "token"),
    names: [],
    conversions: bench.conversions,
    ...(bench.record.influx?.pages === "influx" ? { influx: bench.record.influx } : {}),
  };
  const desk = new DeskProcess(config, (words) =>
    supervision.loop.telling.say("desk", "", words, "warn", null, 0, 0),
  );
  const failed = await desk.listening();
  if (failed === "") return desk;
  desk.close();
  throw new Trouble(
    `The page could not be started: ${failed}`,
    "Mend that, or name another port with --port. The bench is dark.",
  );
}

/** Tells people and programs where the daemon is to be found. */
function announce(
  { bench, socket, folder, telling }: Parts,
  desk: DeskProcess,
  supervision: Supervision,
  more: readonly string[],
): void {
  const { darkPort } = supervision;
  const { pid } = process;
  const { transport } = bench.controller;
  writeNotice({
    bench: bench.name,
    pid,
    began: beganAt(pid),
    socket,
    page: desk.address(),
    darkPort,
    folder,
    port: transport.kind === "serial" ? transport.path : "",
    endsLight: /^(permit|toggled)$/.test(enforcementOf(bench.controller.stream)),
  });
  const page = desk.sign() ?? desk.address();
  telling.started({ kind: "started", bench: bench.name, pid, page, darkPort, folder }, more);
}

/** What a person should know at the start: hints of the file, what is latched, how light comes. */
function firstWords(supervision: Supervision, hints: number, scripted: boolean): string[] {
  const snapshot = supervision.snapshot();
  const words = hints === 0 ? [] : [`beamsitter check tells ${hints} hints on the bench file.`];
  const { cause } = snapshot;
  if (cause !== null) return [...words, snapshot.sentence, resetWords(snapshot.bench, cause.id)];
  return scripted
    ? words
    : [...words, "It is dark until somebody arms it, on the page or with beamsitter arm."];
}

function lastWords({ name }: Bench, supervision: Supervision): string {
  const { state, enforcement } = supervision.snapshot();
  if (enforcement === "none") {
    return `${name} is not watched any more; its light is as it was. The daemon has ended.`;
  }
  if (state === "offline") return `${name} was not connected. The daemon has ended.`;
  return isLit(supervision)
    ? `${name} has not confirmed dark; without permits it is dark within its term. Go and look.`
    : `${name} is left dark. The daemon has ended.`;
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
