import type { FastifyInstance, FastifyReply, FastifyRequest } from "fastify";
import { z } from "zod";
import type { SwitchAnswer } from "../control/api.ts";
import { eventLine } from "./event-lines.ts";
import { askerFor, isApi } from "./guarded.ts";
import { parseSeries, parseWindow, seriesJson } from "./series.ts";
import type { DeskParts } from "./server.ts";

const Current = z.strictObject({ current_mA: z.number().min(0).max(1e6) });
const Reset = z.strictObject({ cause: z.string().min(1).max(64) });

const badRequest = (reply: FastifyReply, words: string): FastifyReply =>
  reply.code(400).send({ ok: false, reason: "bad-request", words });

/** A refusal by the judge is an answer like any other; only the silence of the switch is a fault. */
const told = (reply: FastifyReply, answer: SwitchAnswer): FastifyReply =>
  reply.code(answer.ok ? 200 : answer.reason === "no-answer" ? 503 : 409).send(answer);

/** Everything under /api/. */
export function addAnswers(app: FastifyInstance, parts: DeskParts): void {
  app.addHook("onSend", async (request, reply) => {
    if (isApi(request)) reply.header("cache-control", "no-store");
  });
  addReading(app, parts);
  addAsking(app, parts);
  app.get("/api/live", { websocket: true }, (socket) => parts.live.add(socket));
}

function addReading(app: FastifyInstance, { live, record, line }: DeskParts): void {
  app.get("/api/snapshot", async (_request, reply) => {
    if (live.snapshot !== undefined) return live.snapshot;
    const answer = await line.ask({ verb: "status" });
    return answer.snapshot ?? told(reply, { ...answer, ok: false, reason: "no-answer" });
  });
  app.get("/api/series", async (request, reply) => {
    const asked = parseSeries(live.bench, request.query);
    if (!asked.ok) return badRequest(reply, asked.words);
    const stop = new AbortController();
    request.raw.once("close", () => stop.abort());
    return seriesJson(await record.series(asked.value, stop.signal));
  });
  app.get("/api/events", async (request, reply) => {
    const asked = parseWindow(request.query);
    if (!asked.ok) return badRequest(reply, asked.words);
    return (await record.events(asked.value)).map(eventLine);
  });
}

function addAsking(app: FastifyInstance, { line }: DeskParts): void {
  const current = async (verb: "arm" | "set", request: FastifyRequest, reply: FastifyReply) => {
    const body = Current.safeParse(request.body);
    if (!body.success) {
      return badRequest(reply, 'Send {"current_mA": …}, the current meant in mA, not negative.');
    }
    const asker = askerFor(request);
    return told(reply, await line.ask({ verb, current_mA: body.data.current_mA, asker }));
  };
  app.post("/api/arm", (request, reply) => current("arm", request, reply));
  app.post("/api/set", (request, reply) => current("set", request, reply));
  app.post("/api/reset", async (request, reply) => {
    const body = Reset.safeParse(request.body);
    if (!body.success) {
      return badRequest(
        reply,
        'Send {"cause": "…"}, the id of the cause as the snapshot names it.',
      );
    }
    const asker = askerFor(request);
    return told(reply, await line.ask({ verb: "reset", cause: body.data.cause, asker }));
  });
  app.post("/api/dark", async (request, reply) =>
    told(reply, await line.ask({ verb: "dark", asker: askerFor(request) })),
  );
}
