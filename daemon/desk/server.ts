import fastifyStatic from "@fastify/static";
import fastifyWebsocket from "@fastify/websocket";
import Fastify, { type FastifyInstance } from "fastify";
import type { SeriesQuery, SeriesStore } from "../model/series.ts";
import { addAnswers } from "./answers.ts";
import type { DeskConfig } from "./config.ts";
import type { EventSource } from "./event-lines.ts";
import { addGuard } from "./guarded.ts";
import type { Live } from "./live.ts";
import { addMetrics } from "./metrics.ts";
import { addPages } from "./pages.ts";
import type { SignIn } from "./sign-in.ts";
import type { SwitchLine } from "./switch-line.ts";

/** The record as the desk reads it; `openReader` of record/reader.ts makes one. */
export interface RecordPort extends SeriesStore {
  events(window: SeriesQuery["window"]): Promise<readonly EventSource[]> | readonly EventSource[];
}

export interface DeskParts {
  readonly config: Pick<DeskConfig, "host" | "darkPort" | "names">;
  /** Folder of the built pages. */
  readonly pages: string;
  readonly sign: SignIn;
  readonly line: Pick<SwitchLine, "ask" | "connected">;
  readonly live: Live;
  readonly record: RecordPort;
  /** Samples that the second home does not have yet; null where there is none. */
  readonly waiting?: () => number | null;
}

/** Longest body of a request: a current, a cause or a token. */
const BODY_BYTES_MAX = 4096;
/** Longest message of a page over the live stream, which says nothing. */
const MESSAGE_BYTES_MAX = 1024;

/** The desk's HTTP server, ready to listen. It holds no state of the bench; it asks and passes on. */
export async function buildServer(parts: DeskParts): Promise<FastifyInstance> {
  const app = Fastify({
    bodyLimit: BODY_BYTES_MAX,
    forceCloseConnections: true,
    logger: false,
    trustProxy: false,
  });
  app.setErrorHandler((error: Error & { statusCode?: number }, _request, reply) => {
    const code = error.statusCode ?? 500;
    return reply.code(code).send({ ok: false, reason: "bad-request", words: error.message });
  });
  app.setNotFoundHandler((_request, reply) =>
    reply.code(404).send({ ok: false, reason: "not-found", words: "There is no such page here." }),
  );
  await app.register(fastifyWebsocket, { options: { maxPayload: MESSAGE_BYTES_MAX } });
  addGuard(app, parts);
  await app.register(fastifyStatic, {
    root: `${parts.pages}/assets`,
    prefix: "/assets/",
    decorateReply: false,
    immutable: true,
    maxAge: "365d",
  });
  addPages(app, parts);
  addAnswers(app, parts);
  addMetrics(app, parts);
  return app;
}
