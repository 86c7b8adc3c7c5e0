import { connect, type Socket } from "node:net";
import { LineCutter } from "../control/lines.ts";
import { Keeper } from "./keeper.ts";
import { type KeeperDone, KeeperReply, type KeeperRequest } from "./keeper-api.ts";
import { keeperSocketPath } from "./keeper-socket.ts";
import { RecordProblem } from "./problem.ts";
import { Store } from "./store.ts";
import type { Done } from "./work.ts";

/** How a request is carried out from outside. */
export interface Keeping {
  /** Hears how far it is. */
  readonly progress: (done: Done) => void;
  /** Ends it early; nothing of it stays then. */
  readonly signal: AbortSignal;
}

/**
 * Asks whoever has the folder's record open for writing: a running daemon's recorder, or, where
 * there is none, the same code here under the folder's lock. Throws a RecordProblem.
 */
export async function keep(
  folder: string,
  request: KeeperRequest,
  keeping: Keeping,
): Promise<KeeperDone> {
  const socket = await reachRecorder(keeperSocketPath(folder));
  if (socket !== null) return askRecorder(socket, request, keeping);
  const store = Store.open(folder);
  try {
    return await runHere(new Keeper(store, null), request, keeping);
  } finally {
    store.close();
  }
}

/** A connection to the recorder, or null where nobody listens. */
function reachRecorder(path: string): Promise<Socket | null> {
  return new Promise((resolve) => {
    const socket = connect(path);
    socket.once("connect", () => resolve(socket));
    // No such socket, or one that a killed daemon left: the lock tells whether somebody has it.
    socket.once("error", () => resolve(null));
  });
}

function askRecorder(
  socket: Socket,
  request: KeeperRequest,
  { progress, signal }: Keeping,
): Promise<KeeperDone> {
  return new Promise<KeeperDone>((resolve, reject) => {
    const abort = (): void => reject(signal.reason);
    signal.addEventListener("abort", abort);
    const cutter = new LineCutter(
      (line) => {
        const reply = KeeperReply.parse(JSON.parse(line));
        if (reply.kind === "progress") progress(reply);
        else if (reply.kind === "done") resolve(reply);
        else reject(new RecordProblem(reply.what, reply.found, reply.do));
      },
      () => reject(goneAway()),
    );
    socket.setEncoding("utf8");
    socket.on("data", (text: string) => {
      try {
        cutter.push(text);
      } catch (error) {
        reject(error);
      }
    });
    socket.on("error", () => reject(goneAway()));
    socket.on("close", () => reject(goneAway()));
    socket.write(`${JSON.stringify(request)}\n`);
  }).finally(() => socket.destroy());
}

const goneAway = (): RecordProblem =>
  new RecordProblem(
    "The daemon ended before it had answered.",
    "Its recorder closed the connection.",
    "Look with beamsitter sessions whether it was done, and ask again.",
  );

async function runHere(
  keeper: Keeper,
  request: KeeperRequest,
  { progress, signal }: Keeping,
): Promise<KeeperDone> {
  const work = keeper.work(request);
  try {
    for (;;) {
      const step = work.next();
      if (step.done === true) return step.value;
      progress(step.value);
      // Lets a signal through.
      await new Promise((resolve) => setImmediate(resolve));
      signal.throwIfAborted();
    }
  } finally {
    work.return({ kind: "done", id: 0, words: "" });
  }
}
