import { constants } from "node:fs";
import { access, readdir, readFile, realpath } from "node:fs/promises";
import { basename, dirname, join } from "node:path";
import { groupName, listPorts, ownerWords, type PortInfo } from "./ports.ts";

/** Where the system tells of its ports; a test gives folders of its own. */
export interface PortSystem {
  readonly dev: string;
  readonly sys: string;
  readonly proc: string;
  /** Whether this user may open a device. */
  readonly mayUse: (path: string) => Promise<boolean>;
}

const mayUse = (path: string): Promise<boolean> =>
  access(path, constants.R_OK | constants.W_OK).then(
    () => true,
    () => false,
  );
const THIS_SYSTEM: PortSystem = { dev: "/dev", sys: "/sys", proc: "/proc", mayUse };

/** Something about a port that is worth changing, or knowing, and what to do about it. */
export interface PortAdvice {
  readonly code:
    | "permission"
    | "taken"
    | "prober"
    | "power-saving"
    | "latency"
    | "hang-up"
    | "resets";
  readonly found: string;
  readonly do: string;
}

/** What can be known of a port without opening it: opening would reset many boards. */
export interface PortFacts extends PortInfo {
  /** Kernel driver; empty where it is not known. */
  readonly driver: string;
  /** Group that may use it. */
  readonly group: string;
  readonly allowed: boolean;
  /** Who has it open, in words; empty where nobody is seen. */
  readonly owner: string;
  /** Whether the USB device may be put to sleep; null where it is not known or no USB device. */
  readonly powerSaving: boolean | null;
  /** How long the bridge may hold received bytes back; null where it has no such timer. */
  readonly latency_ms: number | null;
  readonly advice: readonly PortAdvice[];
}

/** Bridges hold bytes for 16 ms unless told otherwise; at 50 samples a second that is most of one. */
const LATENCY_ms_CALM = 4;
/** Programs that open a port that has just appeared, and send text to it. */
const PROBERS = ["ModemManager", "brltty"];
/** Folders above a port's own until the USB device, with some to spare. */
const CLIMB_MAX = 6;

/** Serial ports with everything that is known of them; opens none, and never rejects. */
export async function describePorts(system: PortSystem = THIS_SYSTEM): Promise<PortFacts[]> {
  const ports = await listPorts(system.dev);
  const prober = await runningProber(system.proc);
  return Promise.all(ports.map((port) => factsOf(port, system, prober)));
}

async function factsOf(port: PortInfo, system: PortSystem, prober: string): Promise<PortFacts> {
  const { path } = port;
  const device = join(system.sys, "class/tty", basename(await real(path)), "device");
  const usb = await usbDevice(device);
  const driver = basename(await realpath(join(device, "driver")).catch(() => ""));
  const control = usb === null ? "" : await text(join(usb, "power/control"));
  const timer = join(device, "latency_timer");
  const latency = Number.parseInt(await text(timer), 10);
  const facts = {
    ...port,
    description: port.description || (usb === null ? "" : await usbWords(usb)),
    driver,
    group: await groupName(path),
    allowed: await system.mayUse(path),
    owner: await ownerWords(path),
    powerSaving: control === "" ? null : control === "auto",
    latency_ms: Number.isFinite(latency) ? latency : null,
  };
  const files = { timer, control: usb === null ? "" : join(usb, "power/control") };
  return { ...facts, advice: adviceOn(facts, files, prober) };
}

function adviceOn(
  facts: Omit<PortFacts, "advice">,
  files: { readonly timer: string; readonly control: string },
  prober: string,
): PortAdvice[] {
  const { path, group, latency_ms, owner } = facts;
  const advice: PortAdvice[] = [];
  const add = (code: PortAdvice["code"], found: string, what: string): void =>
    void advice.push({ code, found, do: what });
  if (!facts.allowed) {
    const how = `sudo usermod -aG ${group} "$USER", then sign out and in again`;
    add("permission", `This user may not open it; it belongs to group ${group}.`, how);
  }
  if (owner !== "") {
    add("taken", `It is in use by ${owner}.`, "end that program; one host speaks to a board");
  }
  if (prober !== "" && facts.driver !== "") {
    const how = `sudo systemctl stop ${prober}, or tell it by a udev rule to leave this device alone`;
    add("prober", `${prober} runs; it opens new ports and sends text to them.`, how);
  }
  if (facts.powerSaving === true) {
    const how = `echo on | sudo tee ${files.control}`;
    add("power-saving", "The system may put this USB device to sleep.", how);
  }
  if (latency_ms !== null && latency_ms > LATENCY_ms_CALM) {
    const found = `The bridge holds received bytes back for up to ${latency_ms} ms.`;
    add("latency", found, `echo 1 | sudo tee ${files.timer}`);
  }
  // Both follow from the modem lines, which only a port on USB or an old card has.
  if (facts.driver !== "" && !/amba|uart-pl|8250/.test(facts.driver)) {
    const found =
      "Opening raises DTR: a board wired to reset by it starts anew, and goes dark by that.";
    add(
      "resets",
      found,
      "wait for its banner after opening; a capacitor at reset, or a cut trace, ends it",
    );
    const closed = "Closing drops DTR and RTS (hang-up), unless it was told not to.";
    add("hang-up", closed, `stty -F ${path} -hupcl keeps them, once the port is open anyway`);
  }
  return advice;
}

const text = async (path: string): Promise<string> =>
  (await readFile(path, "utf8").catch(() => "")).trim();
const real = (path: string): Promise<string> => realpath(path).catch(() => path);

/** Folder of the USB device that a port belongs to; null where it belongs to none. */
async function usbDevice(device: string): Promise<string | null> {
  let folder = await realpath(device).catch(() => "");
  for (let n = 0; n < CLIMB_MAX && folder.length > 1; n += 1) {
    if ((await text(join(folder, "idVendor"))) !== "") return folder;
    folder = dirname(folder);
  }
  return null;
}

/** What a USB device calls itself, as the library tells it where udevadm is there. */
async function usbWords(usb: string): Promise<string> {
  const words = await Promise.all(
    ["manufacturer", "product", "serial"].map((f) => text(join(usb, f))),
  );
  return words.filter((word) => word !== "").join(" ");
}

async function runningProber(proc: string): Promise<string> {
  const names = await readdir(proc).catch(() => []);
  const pids = names.filter((name) => /^\d+$/.test(name));
  const running = await Promise.all(pids.map((pid) => text(join(proc, pid, "comm"))));
  return PROBERS.find((prober) => running.includes(prober)) ?? "";
}
