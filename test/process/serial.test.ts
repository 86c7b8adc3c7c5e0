import { type ChildProcess, spawn } from "node:child_process";
import { once } from "node:events";
import { existsSync, mkdirSync, mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { SerialPort } from "serialport";
import { afterEach, beforeEach, describe, expect, test, vi } from "vitest";
import { listPorts } from "../../daemon/link/transports/ports.ts";
import { Reconnect } from "../../daemon/link/transports/reconnect.ts";
import { SerialTransport } from "../../daemon/link/transports/serial.ts";
import { openFailureWords } from "../../daemon/link/transports/serial-words.ts";

/** Longest wait for anything here. */
const WAIT = { timeout: 5000, interval: 5 };
let folder: string;
let path: string;
const wires: Wire[] = [];
const ends: { close(): void }[] = [];

/** The far end of a pseudo-terminal: what it hears, and what it says. Killing it unplugs the port. */
class Wire {
  heard = "";
  private readonly socat: ChildProcess;

  constructor(link: string) {
    this.socat = spawn("socat", [`pty,raw,echo=0,link=${link}`, "-"], {
      stdio: ["pipe", "pipe", "ignore"],
    });
    this.socat.stdout?.on("data", (chunk: Buffer) => {
      this.heard += chunk.toString("latin1");
    });
    wires.push(this);
  }

  static async at(link: string): Promise<Wire> {
    const wire = new Wire(link);
    await vi.waitFor(() => expect(existsSync(link)).toBe(true), WAIT);
    return wire;
  }

  say(text: string): void {
    this.socat.stdin?.write(Buffer.from(text, "latin1"));
  }

  async unplug(): Promise<void> {
    if (this.socat.exitCode !== null || this.socat.signalCode !== null) return;
    const gone = once(this.socat, "exit");
    this.socat.kill("SIGKILL");
    await gone;
    rmSync(path, { force: true });
  }
}

/** An opened serial transport and what it told. */
const openPort = (silence_ms = 4000) => {
  const told = { opened: 0, lines: [] as string[], closed: [] as string[] };
  const transport = new SerialTransport({ path, baud: 115200, silence_ms });
  ends.push(transport);
  transport.open({
    opened: () => {
      told.opened += 1;
    },
    line: (line) => told.lines.push(line),
    closed: (why) => told.closed.push(why),
  });
  return { transport, told };
};
const opened = async (silence_ms?: number) => {
  const port = openPort(silence_ms);
  await vi.waitFor(() => expect(port.told.opened).toBe(1), WAIT);
  return port;
};

beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), "beamsitter-serial-"));
  path = join(folder, "port");
});

afterEach(async () => {
  for (const end of ends.splice(0)) end.close();
  for (const wire of wires.splice(0)) await wire.unplug();
  rmSync(folder, { recursive: true, force: true });
});

describe("serial port", () => {
  test("a path that no list of ports has works, and lines come whole", async () => {
    const wire = await Wire.at(path);
    const { transport, told } = await opened();
    wire.say("<say torn");
    wire.say(" and joined\r\n\n<say second\n");
    await vi.waitFor(
      () => expect(told.lines).toEqual(["<say torn and joined", "<say second"]),
      WAIT,
    );
    expect(transport.write(">who 1 90B2\n")).toBe(true);
    expect(transport.drained).toBe(false);
    await vi.waitFor(() => expect(wire.heard).toBe(">who 1 90B2\n"), WAIT);
    await vi.waitFor(() => expect(transport.drained).toBe(true), WAIT);
  });

  test("bytes of every value arrive as characters 0 to 255, and a flood without end is cut", async () => {
    const wire = await Wire.at(path);
    const { told } = await opened();
    wire.say(`${"z".repeat(100_000)}\n\u0000\u00ff\u0018\n`);
    await vi.waitFor(() => expect(told.lines).toHaveLength(2), WAIT);
    expect(told.lines[0]).toHaveLength(162);
    expect(told.lines[1]).toBe("\u0000\u00ff\u0018");
  });

  test("unplugged while open: closed once, with or without an event, and nothing spins after", async () => {
    for (let i = 0; i < 6; i += 1) {
      const wire = await Wire.at(path);
      const { transport, told } = await opened(300);
      wire.say("<say hello\n");
      await vi.waitFor(() => expect(told.lines).toHaveLength(1), WAIT);
      await wire.unplug();
      await vi.waitFor(() => expect(told.closed).toHaveLength(1), WAIT);
      expect(transport.write(">late\n")).toBe(false);
      expect(transport.drained).toBe(false);
    }
    const before = process.cpuUsage();
    await new Promise((resolve) => setTimeout(resolve, 400));
    const used = process.cpuUsage(before);
    expect((used.user + used.system) / 400_000).toBeLessThan(0.5);
  });

  test("a port on which nothing comes is given up, with what to check", async () => {
    await Wire.at(path);
    const { told } = await opened(200);
    await vi.waitFor(() => expect(told.closed).toHaveLength(1), WAIT);
    expect(told.closed[0]).toMatch(/sent nothing for 0\.\d s\. Check power, cable, firmware/);
  });

  test("what is written while closed is never sent later", async () => {
    const first = await Wire.at(path);
    const told: string[] = [];
    const link = new Reconnect(() => new SerialTransport({ path, baud: 115200, silence_ms: 300 }), {
      opened: () => told.push("opened"),
      line() {},
      closed: () => told.push("closed"),
    });
    ends.push(link);
    expect(link.write(">permit before\n")).toBe(false);
    await vi.waitFor(() => expect(told).toEqual(["opened"]), WAIT);
    first.say("<say hello\n");
    await first.unplug();
    await vi.waitFor(() => expect(told).toEqual(["opened", "closed"]), WAIT);
    expect(link.write(">permit between\n")).toBe(false);
    const second = await Wire.at(path);
    await vi.waitFor(() => expect(told).toEqual(["opened", "closed", "opened"]), WAIT);
    expect(link.write(">who after\n")).toBe(true);
    await vi.waitFor(() => expect(second.heard).toBe(">who after\n"), WAIT);
    expect(first.heard).toBe("");
  });

  test("closing at once after writing waits for nothing and tells nobody", async () => {
    const wire = await Wire.at(path);
    const { transport, told } = await opened();
    transport.write(">status\n");
    transport.close();
    transport.close();
    expect(transport.drained).toBe(false);
    expect(transport.write(">late\n")).toBe(false);
    const next = await opened();
    next.transport.write(">who\n");
    await vi.waitFor(() => expect(wire.heard).toMatch(/>who\n$/), WAIT);
    expect(wire.heard).not.toMatch(/late/);
    expect(told.closed).toEqual([]);
  });

  test("closed by its owner while still opening, it lets go of the port", async () => {
    const wire = await Wire.at(path);
    const { transport, told } = openPort();
    transport.close();
    const lines: string[] = [];
    const link = new Reconnect(() => new SerialTransport({ path, baud: 115200 }), {
      opened: () => wire.say("<say hello\n"),
      line: (line) => lines.push(line),
      closed() {},
    });
    ends.push(link);
    await vi.waitFor(() => expect(lines).toEqual(["<say hello"]), WAIT);
    expect(told).toEqual({ opened: 0, lines: [], closed: [] });
  });

  test("a stuck port does not collect orders", async () => {
    await Wire.at(path);
    const { transport } = await opened();
    let taken = 0;
    while (taken < 1000 && transport.write(`${"p".repeat(99)}\n`)) taken += 1;
    expect(taken).toBe(40);
  });

  test("one transport opens once", async () => {
    await Wire.at(path);
    const { transport } = await opened();
    expect(() => transport.open({ opened() {}, line() {}, closed() {} })).toThrow(/opened once/);
  });
});

describe("ports that cannot be used say why and what to do", () => {
  const reason = async (): Promise<string> => {
    const { told } = openPort();
    await vi.waitFor(() => expect(told.closed).toHaveLength(1), WAIT);
    expect(told.opened).toBe(0);
    return told.closed[0] ?? "";
  };

  test("in use: the exclusive lock refuses a second host, and names it", async () => {
    await Wire.at(path);
    await opened();
    const why = await reason();
    expect(why).toMatch(/is in use by another program.*end that program first/);
  });

  test("missing", async () => {
    expect(await reason()).toMatch(/port does not exist\. (No serial port is there|There is:)/);
  });

  test("a folder, a file, a device that is no serial port", async () => {
    mkdirSync(path);
    expect(await reason()).toMatch(/is no serial port but a folder/);
    rmSync(path, { recursive: true });
    writeFileSync(path, "");
    expect(await reason()).toMatch(/is no serial port but a file/);
    path = "/dev/null";
    expect(await reason()).toMatch(/no serial port/);
  });

  test("not allowed: names the group of the device file and the command", async () => {
    writeFileSync(path, "");
    const words = await openFailureWords(path, "Error: Permission denied, cannot open");
    expect(words).toMatch(
      /belongs to group \S+\. Run: sudo usermod -aG \S+ "\$USER", then sign out/,
    );
  });
});

describe("list of ports", () => {
  test("is made where udevadm is missing", async () => {
    const list = vi.spyOn(SerialPort, "list").mockRejectedValue(new Error("spawn udevadm ENOENT"));
    for (const name of ["ttyUSB0", "ttyACM3", "tty", "ttyS0", "null"]) {
      writeFileSync(join(folder, name), "");
    }
    const ports = await listPorts(folder);
    list.mockRestore();
    expect(ports.map((p) => p.path)).toEqual([join(folder, "ttyACM3"), join(folder, "ttyUSB0")]);
    expect(ports.every((p) => p.problem === "")).toBe(true);
  });

  test("tells which port is taken, without opening it", async () => {
    const list = vi.spyOn(SerialPort, "list").mockRejectedValue(new Error("spawn udevadm ENOENT"));
    path = join(folder, "ttyUSB0");
    await Wire.at(path);
    const before = await listPorts(folder);
    await opened();
    const after = await listPorts(folder);
    list.mockRestore();
    // The far end holds its own side of the pseudo-terminal; the lock of a host says more.
    expect(before[0]?.problem).toMatch(/in use by socat, process \d+/);
    expect(after[0]?.problem).toMatch(new RegExp(`in use by .*process ${process.pid}$`));
  });

  test("the library's own list, whatever this machine has, never rejects", async () => {
    await expect(listPorts()).resolves.toBeInstanceOf(Array);
  });
});
