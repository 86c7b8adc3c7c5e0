import { readFileSync } from "node:fs";
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from "vitest";
import { assetFile } from "../../daemon/paths.ts";
import { type PtyBoard, startPtyBoard } from "../hardware/pty-board.ts";
import { Daemon, Place, runCli } from "./daemon.ts";

/**
 * The daemon as a real process against the real firmware in a simulated chip, over a pseudo
 * terminal, in wall-clock time. This is smoke: times are generous, because a busy machine stalls;
 * what is exact is tested in simulated time (test/hardware).
 */
const LIGHT_ms = 30_000;
const DARK_ms = 5_000;

/**
 * The bare diode's own file, at this board's terminal, with a term of two seconds: a machine that is
 * busy with other tests must not end light for a reason that is not the test's.
 */
const benchText = (path: string): string =>
  readFileSync(assetFile("daemon/bench-file/benches/bare-diode.yaml"), "utf8")
    .replace(/path: \S+/, `path: ${path}`)
    .replace("term: 500 ms", "term: 2 s");

/** Resolves when the diode is dark, as measured at the diode; how long that took, ms. */
async function untilDark(board: PtyBoard): Promise<number> {
  const began = performance.now();
  while (performance.now() - began < DARK_ms) {
    if (!(await board.state()).emitting) return performance.now() - began;
  }
  throw new Error(`still lit after ${DARK_ms} ms`);
}

describe("a daemon over a simulated board", () => {
  let place: Place;
  let board: PtyBoard;
  let daemon: Daemon;

  beforeAll(async () => {
    place = new Place();
    board = await startPtyBoard();
  });
  afterAll(() => {
    board.stop();
    place.remove();
  });
  beforeEach(async () => {
    daemon = await Daemon.start(
      place,
      "bare-diode",
      "--bench",
      place.file("bench.yaml", benchText(board.path)),
    );
  });
  afterEach(async () => {
    await daemon.signal("SIGKILL");
  });

  /** Clears whatever the test before left latched, then arms and waits for light. */
  async function light(): Promise<void> {
    await daemon.until((s) => s.link.phase === "ready" && s.state !== "offline", LIGHT_ms);
    const { cause } = await daemon.snapshot();
    if (cause !== null) {
      const reset = await daemon.client.ask({ verb: "reset", cause: cause.id, asker: "person" });
      expect(reset.words).toBe("bare-diode is reset and dark. Arm it to have light again.");
    }
    const armed = await daemon.client.ask({ verb: "arm", current_mA: 450, asker: "person" });
    expect(armed.ok, armed.words).toBe(true);
    await daemon.until((s) => s.state === "emitting" && (s.current_mA ?? 0) > 400, LIGHT_ms);
    expect((await board.state()).emitting).toBe(true);
  }

  test("a bench that is not the built-in one starts dark and stays dark until somebody arms it", async () => {
    await daemon.until((s) => s.state === "standby", LIGHT_ms);
    const scripted = await daemon.client.ask({
      verb: "arm",
      current_mA: 600,
      asker: "scripted-person",
    });
    expect(scripted.reason).toBe("not-built-in");
    expect((await daemon.snapshot()).state).toBe("standby");
    expect((await board.state()).emitting).toBe(false);
  });

  test("dark over the switch: dark, and in standby", async () => {
    await light();
    await daemon.client.ask({ verb: "dark", asker: "person" });
    await untilDark(board);
    await daemon.until((s) => s.state === "standby", DARK_ms);
  });

  test("SIGTERM: dark, and tripped as stopped when the daemon comes back", async () => {
    await light();
    const ended = daemon.signal("SIGTERM");
    await untilDark(board);
    expect(await ended).toBe(0);
    const status = await runCli(place, "status");
    expect(status.code).toBe(3);
    daemon = await Daemon.start(place, "bare-diode", "--bench", `${place.folder}/bench.yaml`);
    const s = await daemon.until((x) => x.state === "tripped", LIGHT_ms);
    expect(s.cause?.id).toBe("daemon-stopped");
  });

  test("SIGKILL: the permits end, the board goes dark by itself and stays latched", async () => {
    await light();
    await daemon.signal("SIGKILL");
    await untilDark(board);
    daemon = await Daemon.start(place, "bare-diode", "--bench", `${place.folder}/bench.yaml`);
    const s = await daemon.until((x) => x.state === "tripped", LIGHT_ms);
    expect(["permit-expired", "host-restarted"]).toContain(s.cause?.id);
    expect((await board.state()).emitting).toBe(false);
  });

  test("SIGSTOP: dark by the term, and dark still after SIGCONT", async () => {
    await light();
    daemon.child.kill("SIGSTOP");
    await untilDark(board);
    daemon.child.kill("SIGCONT");
    const s = await daemon.until((x) => x.state === "tripped", LIGHT_ms);
    expect(s.cause).not.toBeNull();
    expect((await board.state()).emitting).toBe(false);
  });
});
