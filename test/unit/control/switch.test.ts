import { mkdtempSync, rmSync } from "node:fs";
import { connect } from "node:net";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterEach, beforeEach, describe, expect, test } from "vitest";
import type { SwitchAnswer, SwitchRequest } from "../../../daemon/control/api.ts";
import { SwitchClient, SwitchSilent } from "../../../daemon/control/client.ts";
import { SWITCH_LINE_BYTES_MAX } from "../../../daemon/control/lines.ts";
import { type Switch, serveSwitch } from "../../../daemon/control/switch.ts";

let folder: string;
let path: string;
let served: Switch;
let asked: SwitchRequest[];

const echo = (request: SwitchRequest, answer: (a: SwitchAnswer) => void): void => {
  asked.push(request);
  answer({ id: request.id, ok: true, reason: "", words: `heard ${request.verb}` });
};

beforeEach(async () => {
  folder = mkdtempSync(join(tmpdir(), "bs-switch-"));
  path = join(folder, "s");
  asked = [];
  served = await serveSwitch(path, { ask: echo });
});
afterEach(() => {
  served.close();
  rmSync(folder, { recursive: true, force: true });
});

/** What the switch writes back to raw text, until it closes or has sent a whole line. */
function raw(text: string): Promise<string> {
  return new Promise((resolve) => {
    const socket = connect(path, () => socket.write(text));
    let got = "";
    socket.on("data", (bytes) => {
      got += bytes.toString();
      if (got.endsWith("\n")) socket.end();
    });
    socket.on("close", () => resolve(got));
    socket.on("error", () => resolve(got));
  });
}

describe("the switch", () => {
  test("brings a request to the judge and the answer back to the one who asked", async () => {
    const [one, two] = await Promise.all([SwitchClient.connect(path), SwitchClient.connect(path)]);
    const [a, b] = await Promise.all([
      one.ask({ verb: "dark", asker: "person" }),
      two.ask({ verb: "arm", current_mA: 1200, asker: "script" }),
    ]);
    expect([a.words, b.words]).toEqual(["heard dark", "heard arm"]);
    expect(asked).toContainEqual({ id: 1, verb: "arm", current_mA: 1200, asker: "script" });
    one.close();
    two.close();
  });

  test("a person is the asker where none is named, never something that may do more", async () => {
    expect(await raw('{"id":7,"verb":"arm","current_mA":5}\n')).toContain('"ok":true');
    expect(asked[0]).toMatchObject({ asker: "person" });
  });

  test.each([
    ["not JSON", "dark\n", "not JSON"],
    ["another verb", '{"id":3,"verb":"light"}\n', "verb"],
    ["a current that is text", '{"id":3,"verb":"arm","current_mA":"1.2"}\n', "current_mA"],
    ["null", "null\n", "request"],
  ])("refuses %s in words and asks nobody", async (_name, line, word) => {
    const answer = JSON.parse(await raw(line));
    expect(answer.ok).toBe(false);
    expect(answer.reason).toBe("form");
    expect(answer.words).toContain(word);
    expect(asked).toEqual([]);
  });

  test("pushes reach watchers and nobody else", async () => {
    const watcher = await SwitchClient.connect(path);
    const other = await SwitchClient.connect(path);
    const event = { id: 1, at: 2, kind: "dark", hazard: "", weight: "calm" as const, words: "x" };
    const got = new Promise((resolve) => watcher.watch(resolve).catch(resolve));
    await other.ask({ verb: "status" });
    await expect.poll(() => served.watchers).toBe(1);
    served.push({ push: "event", event });
    expect(await got).toEqual({ push: "event", event });
    watcher.close();
    other.close();
  });

  test("a line without an end is refused before it fills memory", async () => {
    const answer = await raw("x".repeat(SWITCH_LINE_BYTES_MAX + 10));
    expect(answer).toContain("2 MiB");
  });

  test("a client whose daemon ends is told so, not left waiting", async () => {
    const client = await SwitchClient.connect(path);
    served.close();
    await expect(client.ask({ verb: "status" })).rejects.toBeInstanceOf(SwitchSilent);
  });

  test("nobody there is said with the path", async () => {
    await expect(SwitchClient.connect(join(folder, "none"))).rejects.toThrow(/Nobody answers/);
  });
});
