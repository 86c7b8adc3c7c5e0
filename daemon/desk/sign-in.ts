import { createHmac, randomBytes, timingSafeEqual } from "node:crypto";
import { chmodSync, closeSync, openSync, readFileSync, statSync, writeSync } from "node:fs";
import { parseCookie, stringifySetCookie } from "cookie";

/** How long a code in an address can be used: long enough to walk to another window. */
export const CODE_ms_MAX = 10 * 60_000;
/** Codes waiting at once; more means that something prints addresses in a loop. */
export const CODES_MAX = 16;
/** A signed-in browser stays so for a month of nights. A new token ends all of them. */
export const COOKIE_ms_MAX = 30 * 24 * 3_600_000;
const TOKEN_BYTES = 32;
const TOKEN_CHARS_MIN = 32;

/**
 * The token of this data folder, made where there is none. Refuses a file that others can read,
 * since every local user could then switch light on.
 */
export function readToken(file: string): string {
  try {
    const fd = openSync(file, "wx", 0o600);
    writeSync(fd, `${randomBytes(TOKEN_BYTES).toString("base64url")}\n`);
    closeSync(fd);
    chmodSync(file, 0o600);
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code !== "EEXIST") throw error;
  }
  const mode = statSync(file).mode & 0o777;
  if ((mode & 0o077) !== 0) {
    throw new Error(
      `${file} has mode ${mode.toString(8)}, so others can read the token; wanted 600. ` +
        `Run: chmod 600 ${file}, and delete it where others may have read it (a new one is made).`,
    );
  }
  const token = readFileSync(file, "utf8").trim();
  if (token.length < TOKEN_CHARS_MIN) {
    throw new Error(
      `${file} holds ${token.length} characters; a token has at least ${TOKEN_CHARS_MIN}. ` +
        "Delete the file; a new one is made.",
    );
  }
  return token;
}

/** Equal in a time that does not tell where two texts part. */
function same(a: string, b: string): boolean {
  const [left, right] = [a, b].map((text) => createHmac("sha256", "same").update(text).digest());
  return left !== undefined && right !== undefined && timingSafeEqual(left, right);
}

/**
 * Codes, cookies and the token. A code is used once; a cookie is a date signed with a key made from
 * the token, so a desk that was restarted in the night still knows its pages.
 */
export class SignIn {
  readonly #token: string;
  readonly #key: Buffer;
  readonly #now: () => number;
  readonly #codes = new Map<string, number>();
  #cookieName = "beamsitter";

  constructor(token: string, now: () => number = Date.now) {
    this.#token = token;
    this.#key = createHmac("sha256", token).update("beamsitter cookie 1").digest();
    this.#now = now;
  }

  /** Browsers keep cookies by host, not by port: two desks on one machine need two names. */
  nameCookieFor(port: number): void {
    this.#cookieName = `beamsitter-${port}`;
  }

  /** Makes a code usable once within CODE_ms_MAX. The oldest falls out beyond CODES_MAX. */
  offer(code: string): void {
    this.#codes.delete(code);
    this.#codes.set(code, this.#now() + CODE_ms_MAX);
    for (const oldest of this.#codes.keys()) {
      if (this.#codes.size <= CODES_MAX) break;
      this.#codes.delete(oldest);
    }
  }

  /** Uses a code up. False for one that is unknown, used or too old. */
  redeem(code: string): boolean {
    const until = this.#codes.get(code);
    this.#codes.delete(code);
    return until !== undefined && this.#now() <= until;
  }

  isToken(text: string): boolean {
    return same(text.trim(), this.#token);
  }

  /** The Set-Cookie header of a browser that has just signed in. */
  cookie(): string {
    const until = this.#now() + COOKIE_ms_MAX;
    return stringifySetCookie({
      name: this.#cookieName,
      value: `${until}.${this.#sign(until)}`,
      path: "/",
      httpOnly: true,
      sameSite: "strict",
      maxAge: COOKIE_ms_MAX / 1000,
    });
  }

  /** How a request proved itself, or undefined where it did not. */
  proofOf(headers: {
    readonly cookie?: string | undefined;
    readonly authorization?: string | undefined;
  }): "cookie" | "token" | undefined {
    const bearer = /^Bearer (.+)$/i.exec(headers.authorization ?? "")?.[1];
    if (bearer !== undefined) return this.isToken(bearer) ? "token" : undefined;
    const value = parseCookie(headers.cookie ?? "")[this.#cookieName];
    const [until = "", mark = ""] = (value ?? "").split(".");
    if (!/^\d{1,15}$/.test(until) || !same(mark, this.#sign(Number(until)))) return undefined;
    return this.#now() <= Number(until) ? "cookie" : undefined;
  }

  #sign(until: number): string {
    return createHmac("sha256", this.#key).update(`${until}`).digest("base64url");
  }
}
