import { spawn } from "node:child_process";
import { once } from "node:events";
import { mkdirSync, readdirSync, readFileSync, truncateSync, writeFileSync } from "node:fs";
import { createServer, type Server } from "node:net";
import { join } from "node:path";
import { SerialPort } from "serialport";
import { afterEach, beforeEach, describe, expect, test, vi } from "vitest";
import { SwitchClient } from "../../daemon/control/client.ts";
import { wall } from "../../daemon/model/times.ts";
import { assetFile } from "../../daemon/paths.ts";
import { openReader } from "../../daemon/record/reader.ts";
import { seal } from "../../firmware-protocol/line.ts";
import { CLI, Daemon, Place, runCli } from "./daemon.ts";
import { Pty } from "./pty.ts";
import { smallDisk, unmount } from "./small-disk.ts";

/** Longest wait for a daemon to say what is wrong; a silent port takes four seconds by itself. */
const SAY_ms = 60_000;
const BARE = readFileSync(assetFile("daemon/bench-file/benches/bare-diode.yaml"), "utf8");

let place: Place;
const ends: (() => unknown)[] = [];

beforeEach(() => {
  place = new Place();
});
afterEach(async () => {
  for (const end of ends.splice(0).reverse()) await end();
  place.remove();
});

/** A daemon on the bare diode's file, with its port at `path`. */
async function daemonAt(path: string, ...args: string[]): Promise<Daemon> {
  const file = place.file("bench.yaml", BARE.replace(/path: \S+/, `path: ${path}`));
  return started("bare-diode", "--bench", file, ...args);
}

async function started(bench: string, ...args: string[]): Promise<Daemon> {
  const daemon = await Daemon.start(place, bench, ...args);
  ends.push(() => daemon.signal("SIGKILL"));
  return daemon;
}

/** What the daemon says of its link, once that fits. */
const linkSays = async (daemon: Daemon, words: RegExp): Promise<string> =>
  (await daemon.until((s) => words.test(s.link.words), SAY_ms)).link.words;

/** Runs `run` with these arguments; it is expected to refuse and to leave nothing behind. */
async function refused(...args: string[]): Promise<{ code: number | null; said: string }> {
  const { code, stderr, stdout } = await runCli(place, "run", "--port", "0", ...args);
  expect(stdout).toBe("");
  const sockets = readdirSync(place.env.XDG_RUNTIME_DIR ?? "", { recursive: true });
  expect(sockets.filter((name) => /socket|json/.test(String(name)))).toEqual([]);
  return { code, said: stderr };
}

async function ptyAt(name: string): Promise<Pty> {
  const pty = await Pty.at(join(place.folder, name));
  ends.push(() => pty.stop());
  return pty;
}

describe("a port that cannot be used: the daemon runs on, tries again, and says why", () => {
  test("no port there: named, with what to do, on every client and in the record", async () => {
    const path = join(place.folder, "ttyNone");
    const daemon = await daemonAt(path);
    const words = await linkSays(daemon, /Try [2-9] follows/);
    expect(words).toContain(`${path} does not exist.`);
    expect(words).toContain("under controller");
    const status = await runCli(place, "status");
    expect(status.code).toBe(0);
    expect(status.stdout).toContain(`Link: ${path} does not exist.`);
    expect((await daemon.signal("SIGTERM")) ?? 0).toBe(0);
    const reader = openReader(join(place.folder, "data", "beamsitter", "bare-diode"));
    const told = reader
      .events({ from: wall(0), to: wall(Date.now() + 60_000) })
      .map((e) => e.data.words);
    reader.close();
    // Once for each reason, not once for each try.
    expect(told.filter((w) => String(w).includes("does not exist"))).toHaveLength(1);
  });

  test("a port in use: the program that has it is named", async () => {
    const { path } = await ptyAt("port");
    const holder = new SerialPort({ path, baudRate: 115200, autoOpen: false, lock: true });
    await new Promise<void>((resolve, reject) =>
      holder.open((error) => (error === null ? resolve() : reject(error))),
    );
    ends.push(() => new Promise((resolve) => holder.close(resolve)));
    const daemon = await daemonAt(path);
    const words = await linkSays(daemon, /in use by/);
    expect(words).toContain(`process ${process.pid}`);
    expect(words).toContain("end that program first");
  });

  test("a port that says nothing", async () => {
    const { path } = await ptyAt("port");
    const words = await linkSays(await daemonAt(path), /sent nothing for/);
    expect(words).toContain("Check power, cable, firmware and baud rate.");
  });

  test("a port that is something else, which prints lines of its own", async () => {
    const pty = await ptyAt("port");
    pty.repeat(Buffer.from("$GPGGA,092751.000,,,,,0,3,,,M,,M,,*4B\r\nhello\r\n"), 50);
    const daemon = await daemonAt(pty.path);
    const words = await linkSays(daemon, /could not be read/);
    expect(words).toContain("whether this port is the board's");
    expect((await daemon.snapshot()).state).toBe("offline");
  });

  test("a wrong baud rate, which makes garbled lines", async () => {
    const pty = await ptyAt("port");
    const noise = Buffer.from(Array.from({ length: 60 }, (_, i) => (i * 89 + 131) % 256));
    pty.repeat(Buffer.concat([noise, Buffer.from("\n")]), 50);
    const words = await linkSays(await daemonAt(pty.path), /could not be read/);
    expect(words).toContain("Look at the baud rate in the bench file");
  });

  test("a path that is no serial port", async () => {
    const path = place.file("notes.txt", "not a port");
    const words = await linkSays(await daemonAt(path), /no serial port/);
    expect(words).toContain("`beamsitter ports` lists the ports.");
  });

  test("another version of the protocol: both versions are named", async () => {
    const server: Server = createServer((socket) => {
      socket.on("error", () => socket.destroy());
      socket.on("data", () => socket.write(`${seal("<hello 2 future-board and more")}\n`));
    }).listen(0, "127.0.0.1");
    await once(server, "listening");
    ends.push(() => server.close());
    const { port } = server.address() as { port: number };
    const file = place.file(
      "bench.yaml",
      BARE.replace(
        /kind: serial[\s\S]*?115200 baud/,
        `kind: tcp\n    host: 127.0.0.1\n    port: ${port}`,
      ),
    );
    const daemon = await started("bare-diode", "--bench", file);
    const words = await linkSays(daemon, /version/);
    expect(words).toContain("The board speaks version 2 of the line protocol");
    expect(words).toContain("Flash firmware of version 1");
    const armed = await runCli(place, "arm", "0.5A", "--confirm", "0.5A");
    expect(armed.code).toBe(1);
    expect(armed.stdout).toContain("version 2 of the line protocol");
  });
});

describe("a bench file that cannot be used: refused before anything starts", () => {
  test("missing, a folder, a pipe", async () => {
    const none = await refused("--bench", join(place.folder, "none.yaml"));
    expect(none.code).toBe(4);
    expect(none.said).toContain("There is no file");
    const folder = await refused("--bench", place.folder);
    expect(folder.code).toBe(4);
    expect(folder.said).toContain("is a folder.");
    const device = await refused("--bench", "/dev/zero");
    expect(device.code).toBe(4);
    expect(device.said).toContain("no file");
  });

  test("empty, binary, and one that is not UTF-8", async () => {
    const empty = await refused("--bench", place.file("empty.yaml", ""));
    expect(empty.code).toBe(1);
    expect(empty.said).toContain("found an empty file; wanted a bench file");
    const file = place.file("binary.yaml", "");
    writeFileSync(file, Buffer.from([0x7f, 0x45, 0x4c, 0x46, 2, 1, 1, 0, 0, 0]));
    const binary = await refused("--bench", file);
    expect(binary.code).toBe(1);
    expect(binary.said).toContain("wanted plain text in UTF-8");
  });

  test("of 100 MB: refused by its size, unread", async () => {
    const file = place.file("huge.yaml", "bench: huge\n");
    truncateSync(file, 100 * 1024 * 1024);
    const huge = await refused("--bench", file);
    expect(huge.code).toBe(4);
    expect(huge.said).toContain("has 104857600 bytes; a bench file has at most 1048576.");
  });

  test("of deep YAML aliases: refused, at once", async () => {
    const levels = Array.from({ length: 30 }, (_, i) => {
      const before = i === 0 ? '"x"' : `*a${i - 1}`;
      return `a${i}: &a${i} [${Array(10).fill(before).join(", ")}]`;
    });
    const began = performance.now();
    const aliases = await refused("--bench", place.file("aliases.yaml", levels.join("\n")));
    expect(aliases.code).toBe(1);
    expect(aliases.said).toMatch(/alias/);
    expect(performance.now() - began).toBeLessThan(30_000);
  });
});

describe("a place that is taken: refused before anything starts, nothing lost", () => {
  test("two daemons of one bench, on one data folder, and on one page port", async () => {
    const first = await started("north", "--stay-dark");
    const again = await runCli(place, "run", "--port", "0", "--data", join(place.folder, "other"));
    expect(again.code).toBe(4);
    expect(again.stderr).toContain(
      `A daemon already runs bench "north" (process ${first.child.pid})`,
    );
    const data = join(place.folder, "data", "beamsitter", "north");
    const file = place.file("bench.yaml", BARE);
    const shared = await runCli(place, "run", "--port", "0", "--bench", file, "--data", data);
    expect(shared.code).toBe(4);
    expect(shared.stderr).toContain("is in use.");
    expect(shared.stderr).toContain(`${first.child.pid}`);
    expect(shared.stderr).toContain("name another folder with --data");
    const port = new URL(first.notice.page).port;
    const paged = await runCli(place, "run", "--bench", file, "--port", port);
    expect(paged.code).toBe(4);
    expect(paged.stderr).toContain("is in use by the daemon of bench north.");
    expect((await first.snapshot()).recorder.words).toBe("");
  });

  test("a page port in use by another program", async () => {
    const server = createServer().listen(0, "127.0.0.1");
    await once(server, "listening");
    ends.push(() => server.close());
    const { port } = server.address() as { port: number };
    const other = await runCli(place, "run", "--port", String(port));
    expect(other.code).toBe(4);
    expect(other.stderr).toContain(
      `Port ${port} of 127.0.0.1, wanted for the page, is in use by another program.`,
    );
    expect(other.stderr).toContain("--port 0");
  });

  test("--port and --listen that are none", async () => {
    const port = await runCli(place, "run", "--port", "abc");
    expect(port.code).toBe(2);
    expect(port.stderr).toContain("wanted a whole number from 0 to 65535");
    const { code, said } = await refused("--listen", "192.0.2.77");
    expect(code).toBe(2);
    expect(said).toContain("--listen 192.0.2.77 is no address of this computer.");
  });

  test("a data folder that is a file", async () => {
    const file = place.file("data-file", "mine");
    const { code, said } = await refused("--data", file);
    expect(code).toBe(4);
    expect(said).toContain("is no folder.");
    expect(readFileSync(file, "utf8")).toBe("mine");
  });
});

const disk = smallDisk();
if (disk !== null) unmount(disk);

describe.skipIf(disk === null)("a full disk at start (needs the right to mount)", () => {
  test("refused with what to do; what is on the disk stays", async () => {
    const full = smallDisk() as string;
    ends.push(() => unmount(full));
    const data = join(full, "data");
    mkdirSync(data);
    let size = 8 << 20;
    while (size >= 1) {
      try {
        writeFileSync(join(full, `filler-${size}`), Buffer.alloc(size, 1));
      } catch {
        // Full for this size: the rest is filled with smaller pieces.
      }
      size >>= 1;
    }
    const { code, said } = await refused("--data", data);
    expect(code).toBe(4);
    expect(said).toContain(`The record in ${data} cannot be written.`);
    expect(said).toContain("The disk is full.");
  });
});

describe("a terminal that nobody reads", () => {
  async function clientOf(bench: string): Promise<SwitchClient> {
    const socket = join(place.env.XDG_RUNTIME_DIR ?? "", "beamsitter", `${bench}.socket`);
    const wait = { timeout: SAY_ms, interval: 50 };
    const client = await vi.waitFor(() => SwitchClient.connect(socket), wait);
    ends.push(() => client.close());
    return client;
  }

  /** More events than a pipe holds: each refusal is one. */
  async function manyEvents(client: SwitchClient): Promise<void> {
    for (let i = 0; i < 1500; i++) {
      const told = await client.ask({ verb: "set", current_mA: 100, asker: "person" });
      expect(told.ok).toBe(false);
    }
  }

  const run = `'${process.execPath}' '${CLI}' run --port 0 --json --stay-dark`;

  /** Runs a pipeline whose last part reads nothing; the number of that part stands in a file. */
  function pipeline(first: string): string {
    const file = join(place.folder, "reader");
    const reader = `sh -c 'echo $$ > ${file}; exec sleep 1000'`;
    const options = { env: place.env, detached: true, stdio: "ignore" } as const;
    const shell = spawn("sh", ["-c", `${first} | ${reader}`], options);
    ends.push(() => shell.pid !== undefined && process.kill(-shell.pid, "SIGKILL"));
    return file;
  }

  test("a terminal that stands still does not hold up the judge", async () => {
    // `script` gives a terminal; it stops reading it when its own output is stuck.
    pipeline(`script -qfc "${run}" /dev/null`);
    const client = await clientOf("north");
    await manyEvents(client);
    const { snapshot } = await client.ask({ verb: "status" });
    expect(snapshot?.state).not.toBe("tripped");
    await client.ask({ verb: "stop" });
  });

  test("a reader that goes away does not end the daemon", async () => {
    const reader = pipeline(run);
    const client = await clientOf("north");
    await manyEvents(client);
    process.kill(Number(readFileSync(reader, "utf8")), "SIGKILL");
    await manyEvents(client);
    const { snapshot } = await client.ask({ verb: "status" });
    expect(snapshot?.state).not.toBe("tripped");
  });

  test("nor does it hold up the end of the daemon", async () => {
    // Over a socket, as under a service manager; nobody reads it.
    const daemon = spawn(process.execPath, [CLI, "run", "--port", "0", "--json", "--stay-dark"], {
      env: place.env,
      stdio: ["ignore", "pipe", "ignore"],
    });
    ends.push(() => daemon.kill("SIGKILL"));
    await manyEvents(await clientOf("north"));
    daemon.kill("SIGTERM");
    const [code] = await once(daemon, "exit");
    expect(code).toBe(0);
  });
});
