import { type ChildProcess, spawn } from "node:child_process";
import { afterAll, afterEach, beforeAll, describe, expect, test } from "vitest";
import { CLI, Daemon, Place, runCli } from "./daemon.ts";

const READY_ms = 60_000;
let place: Place;
let daemon: Daemon;
let typing: ChildProcess | null = null;

beforeAll(async () => {
  place = new Place();
  daemon = await Daemon.start(place, "north", "--stay-dark");
  await daemon.until((s) => s.link.phase === "ready", READY_ms);
});
afterEach(() => {
  typing?.kill("SIGKILL");
});
afterAll(async () => {
  await daemon.signal("SIGKILL");
  place.remove();
});

/** Runs `arm` at a terminal, and types an answer when it asks; what the terminal shows. */
function armAtTerminal(current: string, answer: string): Promise<string> {
  const line = `'${process.execPath}' '${CLI}' arm ${current}`;
  const child = spawn("script", ["-qec", line, "/dev/null"], { env: place.env });
  typing = child;
  return new Promise((resolve) => {
    let shown = "";
    let answered = false;
    child.stdout.on("data", (bytes: Buffer) => {
      shown += bytes.toString();
      if (answered || !shown.includes("again to go on")) return;
      answered = true;
      child.stdin.write(answer);
    });
    child.on("close", (code) => resolve(`${shown}\nexit ${code}`));
  });
}

describe("arm", () => {
  test("at a terminal: the caution, what the current means, and then it is typed again", async () => {
    const shown = await armAtTerminal("0.9 A", "900mA\r");
    expect(shown).toContain("Not a certified safety function.");
    expect(shown).toMatch(/0\.90\sA gives about .* of\s+room to the ceiling/s);
    expect(shown).toContain("Type 0.9 A again to go on");
    expect(shown).toContain("north is armed for 0.90");
    expect(shown).toContain("exit 0");
    await daemon.until((s) => s.state === "armed" || s.state === "emitting", READY_ms);
    await runCli(place, "dark");
    await daemon.until((s) => s.state === "standby", READY_ms);
  });

  test.each([
    ["yes", "yes\r"],
    ["another current", "9 A\r"],
    ["nothing", "\r"],
    ["Ctrl-C", "\u0003"],
    ["Ctrl-D", "\u0004"],
  ])("at a terminal, %s typed instead: left as it was", async (_what, answer) => {
    const shown = await armAtTerminal("0.9A", answer);
    expect(shown).toContain("Left as it was.");
    expect(shown).toContain("exit 1");
    expect((await daemon.snapshot()).state).toBe("standby");
  });

  test("without a terminal: a script says it twice, the same in any writing", async () => {
    const alone = await runCli(place, "arm", "0.9A");
    expect(alone.code).toBe(2);
    expect(alone.stderr).toContain("--confirm 0.9A. Nothing was changed.");
    const other = await runCli(place, "arm", "0.9A", "--confirm", "0.8A");
    expect(other.code).toBe(2);
    expect((await daemon.snapshot()).state).toBe("standby");
    const same = await runCli(place, "arm", "0.9", "A", "--confirm=900 mA", "--json");
    expect(same.code).toBe(0);
    expect(JSON.parse(same.stdout)).toMatchObject({ ok: true });
    await runCli(place, "dark");
    await daemon.until((s) => s.state === "standby", READY_ms);
  });

  test("what the judge would refuse is refused before anybody types it again", async () => {
    const high = await runCli(place, "arm", "2.1 A", "--json");
    expect(high.code).toBe(1);
    const told = JSON.parse(high.stdout);
    expect(told).toMatchObject({ ok: false, reason: "above-ceiling" });
    expect(told.highest_mA).toBeGreaterThan(1000);
    const low = await runCli(place, "arm", "--", "-1 A");
    expect(low.code).toBe(1);
    expect(low.stdout).toContain("The current is not a number from zero up.");
  });
});
