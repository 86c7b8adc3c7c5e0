import { mkdirSync, mkdtempSync, rmSync, symlinkSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterEach, beforeEach, describe, expect, test } from "vitest";
import { linesOf } from "../../../daemon/cli/ports.ts";
import { describePorts, type PortFacts } from "../../../daemon/link/transports/port-facts.ts";

let root: string;
const at = (...path: string[]): string => join(root, ...path);
const put = (path: string, text: string): void => writeFileSync(at(path), `${text}\n`);

/** A machine with one USB bridge, as the kernel shows it; no udevadm is asked. */
beforeEach(() => {
  root = mkdtempSync(join(tmpdir(), "beamsitter-ports-"));
  const usb = "sys/devices/usb1/1-4";
  for (const folder of ["dev", "proc/42", `${usb}/power`, `${usb}/1-4:1.0/ttyUSB7`]) {
    mkdirSync(at(folder), { recursive: true });
  }
  mkdirSync(at("sys/bus/usb-serial/drivers/ftdi_sio"), { recursive: true });
  mkdirSync(at("sys/class/tty/ttyUSB7"), { recursive: true });
  put("dev/ttyUSB7", "");
  put(`${usb}/idVendor`, "1209");
  put(`${usb}/product`, "Bench bridge");
  put(`${usb}/power/control`, "on");
  put(`${usb}/1-4:1.0/ttyUSB7/latency_timer`, "1");
  put("proc/42/comm", "bash");
  symlinkSync(at(usb, "1-4:1.0/ttyUSB7"), at("sys/class/tty/ttyUSB7/device"));
  symlinkSync(at("sys/bus/usb-serial/drivers/ftdi_sio"), at(usb, "1-4:1.0/ttyUSB7/driver"));
});
afterEach(() => rmSync(root, { recursive: true, force: true }));

const look = async (mayUse = true): Promise<PortFacts> => {
  const system = { dev: at("dev"), sys: at("sys"), proc: at("proc") };
  const ports = await describePorts({ ...system, mayUse: () => Promise.resolve(mayUse) });
  const port = ports.find(({ path }) => path === at("dev/ttyUSB7"));
  if (port === undefined) throw new Error("the port is not listed");
  return port;
};
const codes = ({ advice }: PortFacts): string[] => advice.map(({ code }) => code);

describe("a port is described without being opened", () => {
  test("by the files of the kernel, where nothing is wrong", async () => {
    const port = await look();
    expect(port).toMatchObject({
      description: "Bench bridge",
      driver: "ftdi_sio",
      allowed: true,
      owner: "",
      powerSaving: false,
      latency_ms: 1,
    });
    // What opening and closing do is told of every port with modem lines.
    expect(codes(port)).toEqual(["resets", "hang-up"]);
  });
  test("power saving that is on, with the command that ends it", async () => {
    put("sys/devices/usb1/1-4/power/control", "auto");
    const port = await look();
    expect(port.powerSaving).toBe(true);
    expect(port.advice.find(({ code }) => code === "power-saving")?.do).toContain(
      "sys/devices/usb1/1-4/power/control",
    );
  });
  test("a bridge that holds bytes back", async () => {
    put("sys/devices/usb1/1-4/1-4:1.0/ttyUSB7/latency_timer", "16");
    const port = await look();
    expect(port.latency_ms).toBe(16);
    expect(codes(port)).toContain("latency");
  });
  test("a modem prober that runs", async () => {
    put("proc/42/comm", "ModemManager");
    expect(codes(await look())).toContain("prober");
  });
  test("no permission: the group, and the command", async () => {
    const port = await look(false);
    const permission = port.advice.find(({ code }) => code === "permission");
    expect(permission?.found).toContain(`group ${port.group}`);
    expect(permission?.do).toContain(`usermod -aG ${port.group}`);
  });
  test("a port of no USB device claims nothing", async () => {
    rmSync(at("sys/class/tty/ttyUSB7/device"));
    const port = await look();
    expect(port).toMatchObject({ driver: "", powerSaving: null, latency_ms: null, advice: [] });
  });
  test("in lines, each fact with what to do", async () => {
    const lines = linesOf(await look(false));
    expect(lines[0]).toContain("Bench bridge, ftdi_sio");
    expect(lines).toHaveLength(1 + 2 * 3);
  });
});
