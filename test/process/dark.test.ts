import { spawn } from "node:child_process";
import { once } from "node:events";
import { rmSync, writeFileSync } from "node:fs";
import { join } from "node:path";
import { afterEach, beforeEach, describe, expect, test } from "vitest";
import { Daemon, Place, runCli } from "./daemon.ts";

/** Nothing is timed here: the machine may be busy. Light itself is measured in daemon.test.ts. */
const STATE_ms = 60_000;

let place: Place;
let daemon: Daemon | null = null;

beforeEach(() => {
  place = new Place();
});
afterEach(async () => {
  await daemon?.signal("SIGKILL");
  daemon = null;
  place.remove();
});

const runFolder = (): string => join(place.env.XDG_RUNTIME_DIR ?? "", "beamsitter");

/** A daemon whose bench is armed: by the scripted person of the built-in bench. */
async function armed(): Promise<Daemon> {
  const started = await Daemon.start(place, "north");
  daemon = started;
  await started.until((s) => s.state === "armed" || s.state === "emitting", STATE_ms);
  return started;
}

interface Darkened {
  benches: { bench: string; ok: boolean; way: string; words: string }[];
}
async function dark(...args: string[]): Promise<{ code: number | null; told: Darkened }> {
  const { code, stdout } = await runCli(place, "dark", "--json", ...args);
  return { code, told: JSON.parse(stdout) };
}

describe("beamsitter dark", () => {
  test("without a daemon: says what that means, and that it is not known what others do", async () => {
    const { code, stdout } = await runCli(place, "dark");
    expect(code).toBe(3);
    expect(stdout).toContain("a board without them is dark by itself");
    expect(stdout).toContain("go and look");
    expect((await dark()).told).toEqual({ benches: [] });
  });

  test("with a daemon: dark, in standby, and the daemon lives on", async () => {
    const running = await armed();
    const { code, told } = await dark();
    expect(code).toBe(0);
    expect(told.benches).toMatchObject([{ bench: "north", ok: true }]);
    expect(["switch", "dark port"]).toContain(told.benches[0]?.way);
    await running.until((s) => s.state === "standby", STATE_ms);
  });

  test("--on another bench touches nothing, and names what runs", async () => {
    const running = await armed();
    const { code, stdout } = await runCli(place, "dark", "--on", "south");
    expect(code).toBe(3);
    expect(stdout).toContain('No daemon runs here for a bench named "south"');
    expect(stdout).toContain("Running now: north.");
    expect(["armed", "emitting"]).toContain((await running.snapshot()).state);
  });

  test("with the switch's socket removed: through the dark port", async () => {
    const running = await armed();
    rmSync(join(runFolder(), "north.socket"));
    const { code, told } = await dark("--on", "north");
    expect(code).toBe(0);
    expect(told.benches).toMatchObject([{ way: "dark port", ok: true }]);
    await running.until((s) => s.state === "standby", STATE_ms);
    const status = await runCli(place, "status");
    expect(status.code).toBe(3);
    expect(status.stderr).toContain("beamsitter dark --on north");
  });

  test("with the daemon stopped (SIGSTOP): the daemon is ended, and it says so", async () => {
    const running = await armed();
    const ended = new Promise((resolve) => running.child.once("exit", (_c, name) => resolve(name)));
    running.child.kill("SIGSTOP");
    const { code, told } = await dark();
    expect(code).toBe(0);
    expect(told.benches).toMatchObject([{ way: "daemon ended", ok: true }]);
    expect(told.benches[0]?.words).toContain(`process ${running.child.pid}`);
    expect(await ended).toBe("SIGKILL");
    const again = await Daemon.start(place, "north", "--stay-dark");
    daemon = again;
    // The built-in board began anew with its daemon; the latch on disk is what still knows.
    const s = await again.until((x) => x.state === "tripped", STATE_ms);
    expect(s.cause).not.toBeNull();
  });

  test("a notice left by a killed daemon never ends the process that has its number now", async () => {
    const running = await armed();
    await running.signal("SIGKILL");
    const bystander = spawn("sleep", ["600"]);
    const notice = { ...running.notice, pid: bystander.pid };
    writeFileSync(join(runFolder(), "north.json"), JSON.stringify(notice));
    const { code, told } = await dark();
    expect(code).toBe(3);
    expect(told.benches).toEqual([]);
    expect(bystander.kill("SIGTERM")).toBe(true);
    await once(bystander, "exit");
    expect(bystander.signalCode).toBe("SIGTERM");
    // A bench with such a notice can be run again.
    daemon = await Daemon.start(place, "north", "--stay-dark");
    expect((await daemon.snapshot()).bench).toBe("north");
  });
});
