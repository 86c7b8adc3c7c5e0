import { afterEach, beforeEach, describe, expect, test } from "vitest";
import { type DarkPort, serveDarkPort } from "../../../daemon/control/dark-port.ts";

let port: DarkPort;
let darks: number;

beforeEach(async () => {
  darks = 0;
  port = await serveDarkPort("127.0.0.1", 0, () => {
    darks++;
    return { ok: true, words: "north is ordered dark." };
  });
});
afterEach(() => port.close());

const ask = (method: string, path: string): Promise<Response> =>
  fetch(`http://127.0.0.1:${port.port}${path}`, { method });

describe("the dark port", () => {
  test("POST /dark cuts the light without any sign-in, and any page may read that it did", async () => {
    const response = await ask("POST", "/dark");
    expect(await response.json()).toEqual({ ok: true, words: "north is ordered dark." });
    expect(response.headers.get("access-control-allow-origin")).toBe("*");
    expect(darks).toBe(1);
  });

  test.each([
    ["GET", "/dark", 405],
    ["OPTIONS", "/dark", 204],
    ["POST", "/arm", 404],
    ["POST", "/", 404],
  ])("%s %s changes nothing", async (method, path, status) => {
    expect((await ask(method, path)).status).toBe(status);
    expect(darks).toBe(0);
  });

  test("a body, however long, is not waited for", async () => {
    const response = await fetch(`http://127.0.0.1:${port.port}/dark`, {
      method: "POST",
      body: "x".repeat(1000),
    });
    expect(response.status).toBe(200);
    expect(darks).toBe(1);
  });
});
