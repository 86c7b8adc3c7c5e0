import { type MessagePort, receiveMessageOnPort } from "node:worker_threads";
import type { FromRecorder, ToRecorder } from "../model/record-messages.ts";
import { Ring } from "../model/ring.ts";
import { Keeper } from "./keeper.ts";
import { KeeperSocket } from "./keeper-socket.ts";
import { problemOf } from "./problem.ts";
import { Recorder } from "./recorder.ts";

/** Pace of looking at the ring. Rows are taken one look later than seen, see `pump`. */
const LOOK_ms = 50;

/** Runs a recorder at the other end of `port` until it is closed. */
export function serve(port: MessagePort): void {
  let recorder: Recorder | null = null;
  let ring: Ring | null = null;
  let socket: KeeperSocket | null = null;
  let timer: NodeJS.Timeout | undefined;
  let seen = 0;
  const tell = (message: FromRecorder): void => port.postMessage(message);

  const open = (message: ToRecorder & { kind: "open" }): void => {
    try {
      recorder = new Recorder({ ...message, tell });
      ring = new Ring(message.ring);
      timer = setInterval(pump, LOOK_ms);
      const keeper = new Keeper(recorder.store, message.bench);
      socket = new KeeperSocket(keeper, message.folder);
      tell({ kind: "opened", lastEventId: recorder.lastEventId, latch: recorder.latchAtOpen });
    } catch (error) {
      const problem = problemOf(error, message.folder);
      tell({ kind: "failed", what: problem.what, found: problem.found, do: problem.remedy });
      port.close();
    }
  };

  const close = (): void => {
    clearInterval(timer);
    socket?.close();
    recorder?.close();
    recorder = null;
    tell({ kind: "closed" });
    port.close();
  };

  const handle = (message: ToRecorder): void => {
    if (message.kind === "open") open(message);
    else if (message.kind === "close") close();
    else recorder?.take(message);
  };

  /**
   * A message that names a row may be posted just after that row was written. Rows are therefore
   * taken only when they had been seen at the look before, and all messages since then were read.
   */
  const pump = (): void => {
    if (recorder === null || ring === null) return;
    const limit = seen;
    seen = ring.written;
    for (let m = receiveMessageOnPort(port); m !== undefined; m = receiveMessageOnPort(port)) {
      handle(m.message as ToRecorder);
    }
    recorder?.drain(limit);
  };

  port.on("message", handle);
}
