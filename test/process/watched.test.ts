import { join } from "node:path";
import { afterEach, describe, expect, test } from "vitest";
import { Daemon, Place, runCli } from "./daemon.ts";
import { Pty } from "./pty.ts";

/** What the rest of a bench file needs beside the piece that `listen` proposes. */
const REST = `
diode: { wavelength: 808 nm, threshold: 0.40 A, slope: 1.05 W/A, threshold-t0: 120 K, slope-t1: 350 K, absolute: 2.2 A }
limits: { current: 1.9 A }
derating:
  - { case: 28 °C, current: 2.10 A }
  - { case: 60 °C, current: 1.60 A }
hazards: { case-over: { warn: 40 °C, trip: 45 °C } }
`;
const HEARD_ms_MAX = 20_000;

let place: Place;
let pty: Pty | null = null;
let daemon: Daemon | null = null;

afterEach(async () => {
  await daemon?.signal("SIGKILL");
  pty?.stop();
  place.remove();
});

describe("a board that prints `I=1.52 T=31.4 PD=0.812`", () => {
  test("listen, check and run: watched, and nobody is told that more is enforced", async () => {
    place = new Place();
    const port = join(place.folder, "port");
    pty = await Pty.at(port);
    pty.repeat(Buffer.from("I=1.52 T=31.4 PD=0.812\r\n"), 100);

    const guessed = await runCli(place, "listen", port, "--guess", "--for", "3 s", "--json");
    expect(guessed.stderr).toBe("");
    const guess = JSON.parse(guessed.stdout);
    expect(guess.format).toBe("key-value");
    expect(guess.columns.map((c: { name: string; unit: string }) => [c.name, c.unit])).toEqual([
      ["I", "A"],
      ["T", "°C"],
      ["PD", ""],
    ]);
    expect(guess.undecided).toHaveLength(1);

    const file = place.file("attic.yaml", `bench: attic\n${guess.piece}${REST}`);
    const checked = await runCli(place, "check", file);
    expect(checked.code).toBe(0);
    expect(checked.stdout).toContain("Watched, not enforced");

    daemon = await Daemon.start(place, "attic", "--bench", file);
    const seen = await daemon.until((s) => s.state === "emitting", HEARD_ms_MAX);
    expect(seen).toMatchObject({ watchOnly: true, enforcement: "none" });
    expect(seen.current_mA).toBeCloseTo(1520, 6);
    const status = await runCli(place, "status");
    expect(status.stdout).toContain("attic is watched, not enforced");

    const dark = await runCli(place, "dark", "--on", "attic");
    expect([dark.code, dark.stdout]).toEqual([1, expect.stringContaining("takes no orders")]);
    const again = await runCli(place, "listen", port, "--for", "1 s");
    expect(again.stderr).toContain("is the port of bench attic, which runs");
    expect(await daemon.signal("SIGTERM")).toBe(0);
  }, 90_000);

  test("before a port is opened whose line cuts light, that is said", async () => {
    place = new Place();
    const port = join(place.folder, "port");
    pty = await Pty.at(port);
    pty.repeat(Buffer.from("I=1.52 T=31.4\r\n"), 50);
    const piece = `bench: attic
controller:
  connect: { kind: serial, path: ${port} }
  stream: { format: key-value, columns: { current: { from: I, unit: A } } }
  cut-off: { kind: rts }
${REST}`;
    const file = place.file("attic.yaml", piece);
    const heard = await runCli(place, "listen", port, "--for", "1 s", "--bench", file);
    expect(heard.stderr).toContain("its line RTS is the cut-off of bench attic");
    expect(heard.stdout).toContain("I=1.52 T=31.4\n");
  }, 60_000);
});
