import { chmodSync, mkdtempSync, readFileSync, rmSync, statSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterEach, beforeEach, describe, expect, test } from "vitest";
import {
  CODE_ms_MAX,
  CODES_MAX,
  COOKIE_ms_MAX,
  readToken,
  SignIn,
} from "../../../daemon/desk/sign-in.ts";

const TOKEN = "k".repeat(43);

describe("codes", () => {
  test("a code is used once", () => {
    const sign = new SignIn(TOKEN, () => 0);
    sign.offer("first-code-000000");
    expect(sign.redeem("first-code-000000")).toBe(true);
    expect(sign.redeem("first-code-000000")).toBe(false);
    expect(sign.redeem("never-offered")).toBe(false);
  });

  test("a code dies after ten minutes, not before", () => {
    let now = 0;
    const sign = new SignIn(TOKEN, () => now);
    sign.offer("a-code-0000000000");
    sign.offer("b-code-0000000000");
    now = CODE_ms_MAX;
    expect(sign.redeem("a-code-0000000000")).toBe(true);
    now = CODE_ms_MAX + 1;
    expect(sign.redeem("b-code-0000000000")).toBe(false);
  });

  test("only the newest codes wait; older ones fall out", () => {
    const sign = new SignIn(TOKEN, () => 0);
    for (let i = 0; i <= CODES_MAX; i++) sign.offer(`code-${i}`);
    expect(sign.redeem("code-0")).toBe(false);
    expect(sign.redeem("code-1")).toBe(true);
  });
});

/** The pair that a browser sends back. */
const pairOf = (setCookie: string): string => setCookie.split(";")[0] ?? "";

describe("cookies", () => {
  test("the cookie is strict, hidden from scripts, and believed", () => {
    const sign = new SignIn(TOKEN, () => 5);
    sign.nameCookieFor(8765);
    const set = sign.cookie();
    expect(set).toMatch(/; HttpOnly/);
    expect(set).toMatch(/; SameSite=Strict/);
    expect(sign.proofOf({ cookie: `other=1; ${pairOf(set)}` })).toBe("cookie");
  });

  test("a desk that was restarted knows it; one with another token or port does not", () => {
    const sign = new SignIn(TOKEN, () => 5);
    sign.nameCookieFor(8765);
    const cookie = pairOf(sign.cookie());
    const again = new SignIn(TOKEN, () => 6);
    again.nameCookieFor(8765);
    expect(again.proofOf({ cookie })).toBe("cookie");
    again.nameCookieFor(8766);
    expect(again.proofOf({ cookie })).toBeUndefined();
    const other = new SignIn("o".repeat(43), () => 6);
    other.nameCookieFor(8765);
    expect(other.proofOf({ cookie })).toBeUndefined();
  });

  test("it ends after a month, and its date cannot be moved", () => {
    let now = 0;
    const sign = new SignIn(TOKEN, () => now);
    const cookie = pairOf(sign.cookie());
    now = COOKIE_ms_MAX;
    expect(sign.proofOf({ cookie })).toBe("cookie");
    now = COOKIE_ms_MAX + 1;
    expect(sign.proofOf({ cookie })).toBeUndefined();
    const later = cookie.replace(/=\d+/, `=${COOKIE_ms_MAX * 2}`);
    expect(sign.proofOf({ cookie: later })).toBeUndefined();
  });

  test.each(["", "beamsitter=", "beamsitter=1", "beamsitter=1.x", "beamsitter=%%%", "=;=;"])(
    "%s proves nothing",
    (cookie) => {
      expect(new SignIn(TOKEN, () => 0).proofOf({ cookie })).toBeUndefined();
    },
  );

  test("a wrong token is not saved by a right cookie", () => {
    const sign = new SignIn(TOKEN, () => 0);
    const cookie = pairOf(sign.cookie());
    expect(sign.proofOf({ cookie, authorization: `Bearer ${TOKEN}` })).toBe("token");
    expect(sign.proofOf({ cookie, authorization: "Bearer wrong" })).toBeUndefined();
  });
});

describe("the token file", () => {
  let folder = "";
  beforeEach(() => {
    folder = mkdtempSync(join(tmpdir(), "beamsitter-token-"));
  });
  afterEach(() => rmSync(folder, { recursive: true }));

  test("is made for its owner alone, and read again", () => {
    const file = join(folder, "token");
    const token = readToken(file);
    expect(statSync(file).mode & 0o777).toBe(0o600);
    expect(readToken(file)).toBe(token);
    expect(readFileSync(file, "utf8").trim()).toBe(token);
    expect(token.length).toBeGreaterThanOrEqual(43);
  });

  test("that others can read is refused, with what to do", () => {
    const file = join(folder, "token");
    readToken(file);
    chmodSync(file, 0o640);
    expect(() => readToken(file)).toThrow(/mode 640.*wanted 600.*chmod 600/);
  });

  test("that is too short is refused", () => {
    const file = join(folder, "token");
    writeFileSync(file, "abc\n", { mode: 0o600 });
    expect(() => readToken(file)).toThrow(/holds 3 characters.*at least 32/);
  });
});
