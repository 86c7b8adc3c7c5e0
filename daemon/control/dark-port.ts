import { createServer, type IncomingMessage, type Server, type ServerResponse } from "node:http";

/**
 * The second way to dark: a port on the judging thread that knows one word. `POST /dark` needs no
 * sign-in, because the worst that a stranger can do with it is make a laser dark. It works while the
 * desk is stopped, and the page fires it beside its ordinary way.
 */
export interface DarkPort {
  readonly port: number;
  close(): void;
}

/** Longest request head that is read; a body is never read. */
const HEAD_BYTES_MAX = 4096;

/**
 * Listens on `host:port` (0 picks a free one). `dark` sends the dark at once and returns the sentence
 * that says so. Rejects with the port's own error.
 */
export function serveDarkPort(
  host: string,
  port: number,
  dark: () => { ok: boolean; words: string },
): Promise<DarkPort> {
  const server = createServer({ maxHeaderSize: HEAD_BYTES_MAX }, (request, response) =>
    answer(request, response, dark),
  );
  server.headersTimeout = 2000;
  server.requestTimeout = 2000;
  server.keepAliveTimeout = 1000;
  server.maxConnections = 64;
  // A damaged request ends its own connection and nothing else.
  server.on("clientError", (_error, socket) => socket.destroy());
  return new Promise((resolve, reject) => {
    server.once("error", reject);
    server.listen(port, host, () => resolve({ port: portOf(server), close: () => server.close() }));
  });
}

function portOf(server: Server): number {
  const address = server.address();
  return typeof address === "object" && address !== null ? address.port : 0;
}

function answer(
  request: IncomingMessage,
  response: ServerResponse,
  dark: () => { ok: boolean; words: string },
): void {
  request.resume();
  // Any page may ask for dark and may read that it was heard: both are harmless.
  response.setHeader("access-control-allow-origin", "*");
  response.setHeader("access-control-allow-methods", "POST");
  response.setHeader("cache-control", "no-store");
  response.setHeader("content-type", "application/json");
  if (request.url !== "/dark") {
    response.statusCode = 404;
    response.end(JSON.stringify({ ok: false, words: "This port knows only POST /dark." }));
  } else if (request.method === "POST") {
    response.end(JSON.stringify(dark()));
  } else if (request.method === "OPTIONS") {
    response.statusCode = 204;
    response.end();
  } else {
    response.statusCode = 405;
    response.end(JSON.stringify({ ok: false, words: "Use POST; a mere look changes nothing." }));
  }
}
