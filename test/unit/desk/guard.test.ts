import { describe, expect, test } from "vitest";
import {
  askerOf,
  contentPolicy,
  hostAllowed,
  hostName,
  isLoopback,
  originAllowed,
} from "../../../daemon/desk/guard.ts";

describe("addresses of this machine", () => {
  test.each(["127.0.0.1", "127.3.2.1", "::1", "::ffff:127.0.0.1"])("%s is here", (address) => {
    expect(isLoopback(address)).toBe(true);
  });
  test.each(["192.168.1.4", "::ffff:10.0.0.1", "128.0.0.1", "127.0.0.1.example", ""])(
    "%s is elsewhere",
    (address) => {
      expect(isLoopback(address)).toBe(false);
    },
  );
});

describe("the Host header", () => {
  const here = { listensBeyond: false, names: [] };
  const beyond = { listensBeyond: true, names: ["bench.lab"] };

  test.each([
    ["127.0.0.1:8765", "127.0.0.1"],
    ["LOCALHOST", "localhost"],
    ["[::1]:80", "[::1]"],
  ])("%s names %s", (header, name) => {
    expect(hostName(header)).toBe(name);
  });

  test.each(["", "a b", "user@127.0.0.1", "127.0.0.1:8765/x", "127.0.0.1:123456", undefined])(
    "%s is malformed",
    (header) => {
      expect(hostName(header)).toBeUndefined();
      expect(hostAllowed(header, beyond)).toBe(false);
    },
  );

  test("a borrowed name is refused, also where the desk listens beyond this machine", () => {
    expect(hostAllowed("evil.example:8765", here)).toBe(false);
    expect(hostAllowed("evil.example:8765", beyond)).toBe(false);
    expect(hostAllowed("localhost.evil.example", beyond)).toBe(false);
  });

  test("addresses and listed names are allowed only where other machines were asked for", () => {
    expect(hostAllowed("192.168.1.4:8765", here)).toBe(false);
    expect(hostAllowed("192.168.1.4:8765", beyond)).toBe(true);
    expect(hostAllowed("bench.lab:8765", here)).toBe(false);
    expect(hostAllowed("bench.lab:8765", beyond)).toBe(true);
  });
});

describe("the Origin header", () => {
  test.each([
    [undefined, true],
    ["http://127.0.0.1:8765", true],
    ["http://127.0.0.1:8766", false],
    ["https://127.0.0.1:8765", false],
    ["http://127.0.0.1:8765.evil.example", false],
    ["null", false],
  ])("%s is allowed: %s", (origin, allowed) => {
    expect(originAllowed(origin, "127.0.0.1:8765")).toBe(allowed);
  });
});

test("another machine is away whatever it proves with; here a cookie is a page", () => {
  expect(askerOf("10.0.0.7", "cookie")).toBe("away");
  expect(askerOf("10.0.0.7", "token")).toBe("away");
  expect(askerOf("127.0.0.1", "cookie")).toBe("page");
  expect(askerOf("::1", "token")).toBe("script");
});

test("the content policy allows the desk and its dark port, and no inline script or style", () => {
  const policy = contentPolicy("127.0.0.1:8765", 8766);
  expect(policy).toContain("default-src 'none'");
  expect(policy).toContain("connect-src 'self' ws://127.0.0.1:8765 http://127.0.0.1:8766");
  expect(policy).not.toContain("unsafe");
});
