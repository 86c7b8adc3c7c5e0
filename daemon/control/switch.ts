import { createServer, type Server, type Socket } from "node:net";
import { type SwitchAnswer, type SwitchPush, SwitchRequest } from "./api.ts";
import { LineCutter } from "./lines.ts";

/**
 * The switch: a local socket on the judging thread, one JSON object a line. Its folder is readable
 * by its owner alone, and that is its authentication. Command line and desk are both clients.
 * It never waits: a watcher that does not read is dropped, a request is answered when the judge has
 * answered.
 */
export interface SwitchHandler {
  /** Carries a request out; `answer` is called once, now or later, from the judging thread. */
  ask(request: SwitchRequest, answer: (a: SwitchAnswer) => void): void;
}

/** Most clients at once: a desk, a few commands, a few scripts. */
const CLIENTS_MAX = 32;
/** Bytes a watcher may leave unread before it is dropped: some seconds of snapshots. */
const UNREAD_BYTES_MAX = 512 * 1024;

export interface Switch {
  push(message: SwitchPush): void;
  readonly watchers: number;
  close(): void;
}

/** Listens on `path` (a Unix socket). Resolves when it listens; rejects with the socket's error. */
export function serveSwitch(path: string, handler: SwitchHandler): Promise<Switch> {
  const clients = new Set<Socket>();
  const watchers = new Set<Socket>();
  const server = createServer((socket) => {
    if (clients.size >= CLIENTS_MAX) {
      socket.end(refusal(0, "busy", `The switch already has ${CLIENTS_MAX} clients.`));
      return;
    }
    clients.add(socket);
    serveClient(socket, handler, watchers, () => {
      clients.delete(socket);
      watchers.delete(socket);
    });
  });
  return new Promise((resolve, reject) => {
    server.once("error", reject);
    server.listen(path, () => resolve(makeSwitch(server, clients, watchers)));
  });
}

function makeSwitch(server: Server, clients: Set<Socket>, watchers: Set<Socket>): Switch {
  return {
    push(message) {
      if (watchers.size === 0) return;
      const text = `${JSON.stringify(message)}\n`;
      for (const socket of watchers) {
        if (socket.writableLength > UNREAD_BYTES_MAX) socket.destroy();
        else socket.write(text);
      }
    },
    get watchers() {
      return watchers.size;
    },
    close() {
      server.close();
      for (const socket of clients) socket.end();
    },
  };
}

function serveClient(
  socket: Socket,
  handler: SwitchHandler,
  watchers: Set<Socket>,
  gone: () => void,
): void {
  socket.setEncoding("utf8");
  const say = (a: SwitchAnswer): void => {
    if (!socket.destroyed) socket.write(`${JSON.stringify(a)}\n`);
  };
  const cutter = new LineCutter(
    (line) => {
      const request = parseRequest(line);
      if (typeof request === "string") {
        socket.write(request);
        return;
      }
      if (request.verb === "watch") watchers.add(socket);
      handler.ask(request, say);
    },
    () => socket.end(refusal(0, "form", "A line over 2 MiB came; the connection ends.")),
  );
  socket.on("data", (text: string) => cutter.push(text));
  // A client that vanishes is ordinary: its socket closes, nothing else depends on it.
  socket.on("error", () => socket.destroy());
  socket.on("close", gone);
}

function parseRequest(line: string): SwitchRequest | string {
  let value: unknown;
  try {
    value = JSON.parse(line);
  } catch {
    return refusal(0, "form", "The line is not JSON. One JSON object a line is wanted.");
  }
  const parsed = SwitchRequest.safeParse(value);
  if (parsed.success) return parsed.data;
  const id = (value as { id?: unknown } | null)?.id;
  const found = parsed.error.issues.map((i) => `${i.path.join(".") || "request"}: ${i.message}`);
  return refusal(typeof id === "number" ? id : 0, "form", found.join("; "));
}

const refusal = (id: number, reason: string, words: string): string =>
  `${JSON.stringify({ id, ok: false, reason, words } satisfies SwitchAnswer)}\n`;
