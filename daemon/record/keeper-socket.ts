import { createHash } from "node:crypto";
import { mkdirSync, rmSync } from "node:fs";
import { createServer, type Server, type Socket } from "node:net";
import { tmpdir, userInfo } from "node:os";
import { join, resolve } from "node:path";
import { LineCutter } from "../control/lines.ts";
import type { Keeper } from "./keeper.ts";
import { type KeeperDone, type KeeperReply, KeeperRequest } from "./keeper-api.ts";
import { problemOf } from "./problem.ts";
import type { Done, Work } from "./work.ts";

/** The longest path a Unix socket may have on Linux is 107 bytes. */
const SOCKET_PATH_BYTES_MAX = 107;
/** Work goes on for so long before the recorder has its turn, ms; its ring holds a minute. */
const TURN_ms = 10;

/**
 * Where the recorder of a data folder listens: in the folder itself, which only its owner may enter,
 * or, where that path would be too long for a socket, in the user's own temporary folder.
 */
export function keeperSocketPath(folder: string): string {
  const path = join(resolve(folder), "record.socket");
  if (Buffer.byteLength(path) <= SOCKET_PATH_BYTES_MAX) return path;
  const own = join(tmpdir(), `beamsitter-${userInfo().uid}`);
  mkdirSync(own, { recursive: true, mode: 0o700 });
  const name = createHash("sha256").update(resolve(folder)).digest("hex").slice(0, 16);
  return join(own, `${name}.record`);
}

/**
 * The recorder's own socket. A request is worked on between two looks at the ring, a few
 * milliseconds at a time; whoever asked and goes away ends the work, and nothing of it stays.
 */
export class KeeperSocket {
  readonly #server: Server;
  readonly #keeper: Keeper;
  readonly #open = new Set<Socket>();
  readonly #works = new Set<Work<KeeperDone>>();
  readonly #path: string;

  /** Listens from now on. The folder's lock is held; where no socket can be, none is there. */
  constructor(keeper: Keeper, folder: string) {
    this.#keeper = keeper;
    this.#path = keeperSocketPath(folder);
    // Only the folder's lock decides who listens: what a killed daemon left is no socket.
    rmSync(this.#path, { force: true });
    this.#server = createServer((socket) => this.#serve(socket));
    // A disk that has no sockets: recording goes on, and a command then says who has the folder.
    this.#server.on("error", () => this.#server.close());
    this.#server.listen(this.#path);
  }

  /** Ends what is being worked on as if it had never begun. */
  close(): void {
    for (const work of this.#works) work.return(NOTHING);
    for (const socket of this.#open) socket.destroy();
    this.#server.close();
    rmSync(this.#path, { force: true });
  }

  #serve(socket: Socket): void {
    this.#open.add(socket);
    socket.setEncoding("utf8");
    const cutter = new LineCutter(
      (line) => this.#answer(socket, line),
      () => socket.destroy(),
    );
    socket.on("data", (text: string) => cutter.push(text));
    socket.on("error", () => socket.destroy());
    socket.on("close", () => this.#open.delete(socket));
  }

  #answer(socket: Socket, line: string): void {
    const request = requestOf(line);
    if (request !== null) {
      this.#drive(socket, this.#keeper.work(request));
      return;
    }
    send(socket, {
      kind: "refused",
      what: "The recorder does not understand this.",
      found: `It was asked ${line.slice(0, 80)}.`,
      do: "Use the same version of beamsitter for daemon and commands.",
    });
  }

  /** Steps through the work until it is done, refused, or nobody waits for it any more. */
  #drive(socket: Socket, work: Work<KeeperDone>): void {
    this.#works.add(work);
    const turn = (): void => {
      try {
        const step = socket.destroyed ? work.return(NOTHING) : oneTurn(work);
        if (step.done === true) send(socket, step.value);
        else {
          send(socket, { kind: "progress", ...step.value });
          setImmediate(turn);
          return;
        }
      } catch (error) {
        const { what, found, remedy } = problemOf(error, "its data folder");
        send(socket, { kind: "refused", what, found, do: remedy });
      }
      this.#works.delete(work);
    };
    turn();
  }
}

/** Works for a few milliseconds, or to the end. */
function oneTurn(work: Work<KeeperDone>): IteratorResult<Done, KeeperDone> {
  const until = performance.now() + TURN_ms;
  for (;;) {
    const step = work.next();
    if (step.done === true || performance.now() >= until) return step;
  }
}

const NOTHING: KeeperDone = { kind: "done", id: 0, words: "" };

const send = (socket: Socket, reply: KeeperReply): void => {
  if (!socket.destroyed) socket.write(`${JSON.stringify(reply)}\n`);
};

function requestOf(line: string): KeeperRequest | null {
  try {
    const parsed = KeeperRequest.safeParse(JSON.parse(line));
    return parsed.success ? parsed.data : null;
  } catch {
    // No JSON at all: the same as an unknown request.
    return null;
  }
}
