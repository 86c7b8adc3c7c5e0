import { readFileSync } from "node:fs";
import formBody from "node:querystring";
import type { FastifyInstance, FastifyReply, FastifyRequest } from "fastify";
import { contentPolicy } from "./guard.ts";
import { isAway, proofOf } from "./guarded.ts";
import type { DeskParts } from "./server.ts";
import { SIGN_STYLE_HASH, signPage } from "./sign-page.ts";

const NOT_SIGNED = "This browser is not signed in.";
const USED = "That address was used already, or is older than ten minutes.";
const WRONG = "That is not the token of this data folder.";
const AWAY = "From another machine the token is needed, not an address.";

/** The dark port stands in the page itself: a page that was loaded can go dark without the desk. */
const withDarkPort = (html: string, port: number): string =>
  html.replaceAll("__DARK_PORT__", `${port}`);

/** `GET /`, and the exchange of a code or the token for a cookie. */
export function addPages(app: FastifyInstance, parts: DeskParts): void {
  const { config, sign } = parts;
  const html = withDarkPort(readFileSync(`${parts.pages}/index.html`, "utf8"), config.darkPort);
  app.addContentTypeParser(
    "application/x-www-form-urlencoded",
    { parseAs: "string" },
    (_request, body, done) => done(null, formBody.parse(body.toString())),
  );

  const page = (request: FastifyRequest, reply: FastifyReply, style = ""): FastifyReply =>
    reply
      .header("content-security-policy", contentPolicy(request.host, config.darkPort, style))
      .header("cache-control", "no-store")
      .type("text/html; charset=utf-8");
  const toSign = (request: FastifyRequest, reply: FastifyReply, why: string): FastifyReply =>
    page(request, reply, SIGN_STYLE_HASH)
      .code(401)
      .send(signPage(why, isAway(request)));
  const signedIn = (reply: FastifyReply): FastifyReply =>
    reply
      .header("set-cookie", sign.cookie())
      .header("cache-control", "no-store")
      .redirect("/", 303);

  app.get("/", (request, reply) =>
    proofOf(request) === undefined
      ? toSign(request, reply, NOT_SIGNED)
      : page(request, reply).send(html),
  );
  app.get<{ Querystring: { code?: string } }>("/sign", (request, reply) => {
    if (isAway(request)) return toSign(request, reply, AWAY);
    if (sign.redeem(`${request.query.code ?? ""}`)) return signedIn(reply);
    // An address opened a second time in the same browser is not a mistake worth a word.
    if (proofOf(request) !== undefined) return reply.redirect("/", 303);
    return toSign(request, reply, USED);
  });
  app.post<{ Body: { token?: unknown } | null }>("/sign", (request, reply) =>
    sign.isToken(`${request.body?.token ?? ""}`) ? signedIn(reply) : toSign(request, reply, WRONG),
  );
}
