import type { FastifyInstance, FastifyReply, FastifyRequest } from "fastify";
import { askerOf, hostAllowed, isLoopback, originAllowed } from "./guard.ts";
import type { DeskParts } from "./server.ts";

/** Who stands behind a request, known once it has passed the guard. */
export type Proof = "cookie" | "token";
const proofs = new WeakMap<FastifyRequest, Proof>();

/** How a request that passed the guard proved itself; undefined where it needed no proof. */
export const proofOf = (request: FastifyRequest): Proof | undefined => proofs.get(request);

/**
 * Whether the route that will answer stands under /api/. Asked of the route, never of the address as
 * it was written: the router reads `/%61pi/arm` and `http://host/api/arm` as `/api/arm`.
 */
export const isApi = (request: FastifyRequest): boolean =>
  (request.routeOptions.url ?? request.url).startsWith("/api/");

/** Who asks the switch for this request. */
export const askerFor = (request: FastifyRequest): "page" | "script" | "away" =>
  askerOf(request.ip, proofOf(request) ?? "token");

/** Whether the request comes from another machine. */
export const isAway = (request: FastifyRequest): boolean => !isLoopback(request.ip);

const refuse = (reply: FastifyReply, code: number, reason: string, words: string): FastifyReply =>
  reply.code(code).send({ ok: false, reason, words });

/**
 * Stands before every route: the Host must be this desk's, the Origin its own, and everything under
 * /api/ needs a cookie or the token. A cookie is only believed with an Origin where something is
 * asked for, since browsers send it by themselves.
 */
export function addGuard(
  app: FastifyInstance,
  { config, sign }: Pick<DeskParts, "config" | "sign">,
): void {
  const reach = { listensBeyond: !isLoopback(config.host), names: config.names };
  app.addHook("onRequest", async (request, reply) => {
    reply.header("x-content-type-options", "nosniff");
    reply.header("referrer-policy", "no-referrer");
    reply.header("cross-origin-resource-policy", "same-origin");
    const { host = "", origin } = request.headers;
    if (!hostAllowed(host, reach)) {
      const words = `This desk is not called "${host.slice(0, 80)}". Use the address that beamsitter open prints.`;
      return refuse(reply, 421, "host", words);
    }
    if (!originAllowed(origin, host)) {
      return refuse(reply, 403, "origin", "Another site's page asked; this desk answers its own.");
    }
    const proof = sign.proofOf(request.headers);
    if (proof !== undefined) proofs.set(request, proof);
    if (!isApi(request)) return;
    if (proof === undefined) {
      const words = "Not signed in. Run beamsitter open on the bench's computer.";
      return refuse(reply, 401, "not-signed-in", words);
    }
    const acts = request.method !== "GET" || request.ws;
    if (acts && proof === "cookie" && origin === undefined) {
      return refuse(reply, 403, "origin", "A page must say where it comes from; it did not.");
    }
  });
}
