import { type Import, packageOf } from "./imports.ts";

/** What a room may import, beside its own files. */
interface Room {
  /** Folder or file, from the package root; the longest that fits a path is its room. */
  readonly path: string;
  /** Rooms by path; a longer path than a room's own opens only that part of it. */
  readonly rooms: readonly string[];
  /** Packages, `node:` modules by name, or `node:*` for all of them. */
  readonly packages: readonly string[];
  /** Rooms and packages of which only types may be imported: nothing of them is loaded. */
  readonly types?: readonly string[];
  /** No clock, timer, randomness, I/O or process; see purity.test.ts. */
  readonly pure?: true;
}

const MODEL = "daemon/model";
const PHYSICS = "daemon/physics";
const PROTOCOL = "firmware-protocol";

/** Who may lean on whom. Nothing may import what stands further down, but for what is listed. */
export const ROOMS_TABLE: readonly Room[] = [
  { path: MODEL, rooms: [], packages: [], pure: true },
  { path: PHYSICS, rooms: [MODEL], packages: [], pure: true },
  { path: PROTOCOL, rooms: [MODEL], packages: ["zod"], pure: true },
  {
    path: "daemon/bench-file",
    rooms: [MODEL, PHYSICS],
    packages: ["yaml", "zod"],
    pure: true,
  },
  { path: "daemon/judge", rooms: [MODEL, PHYSICS], packages: [], pure: true },
  { path: "daemon/link", rooms: [MODEL, PROTOCOL], packages: [], pure: true },
  {
    path: "daemon/bench-sim",
    rooms: [MODEL, PHYSICS, PROTOCOL],
    // Its scripted person speaks to the switch like anybody, through whoever carries the words.
    types: ["daemon/control/api", "daemon/control/client"],
    packages: [],
    pure: true,
  },
  {
    path: "daemon/link/transports",
    rooms: [MODEL, PROTOCOL, "daemon/link", "daemon/bench-sim", "daemon/paths.ts"],
    packages: ["node:*", "serialport", "@serialport/parser-readline"],
  },
  {
    path: "daemon/control",
    rooms: [MODEL],
    packages: ["node:net", "node:http", "zod"],
  },
  {
    path: "daemon/record",
    rooms: [MODEL, "daemon/judge/records.ts", "daemon/control/lines.ts", "daemon/paths.ts"],
    packages: ["node:*", "better-sqlite3", "hyparquet", "hyparquet-writer", "influx", "zod"],
  },
  {
    path: "daemon/desk",
    rooms: [
      MODEL,
      PHYSICS,
      "daemon/control/api",
      "daemon/control/client",
      "daemon/record/reader",
      "daemon/record/influx-credentials",
      "daemon/record/influx-place",
      "daemon/record/influx-reader",
      "daemon/record/influx-server",
      "daemon/paths.ts",
    ],
    types: ["ws"],
    packages: [
      "node:*",
      "fastify",
      "@fastify/static",
      "@fastify/websocket",
      "cookie",
      "prom-client",
      "zod",
    ],
  },
  {
    path: "daemon/loop",
    rooms: [MODEL, "daemon/judge", "daemon/link", "daemon/control/api"],
    packages: [],
    pure: true,
  },
  {
    path: "daemon/rehearsal",
    rooms: [MODEL, PHYSICS, "daemon/judge", "daemon/bench-file"],
    packages: [],
    pure: true,
  },
  {
    path: "daemon/supervise.ts",
    rooms: [
      MODEL,
      "daemon/judge",
      "daemon/link",
      "daemon/link/transports",
      "daemon/control",
      "daemon/loop",
    ],
    packages: ["node:worker_threads", "node:child_process"],
  },
  {
    path: "daemon/cli",
    rooms: ["daemon", PROTOCOL],
    packages: ["node:*", "commander", "serialport", "zod"],
  },
  { path: "daemon/paths.ts", rooms: [], packages: ["node:path", "node:url"] },
  {
    path: "dashboards",
    rooms: [],
    types: [MODEL, "daemon/desk"],
    packages: ["preact", "@preact/signals"],
  },
];

/** The room that a path belongs to, or undefined for files outside every room. */
export function roomOf(path: string): Room | undefined {
  const fits = ROOMS_TABLE.filter((room) => path === room.path || path.startsWith(`${room.path}/`));
  return fits.sort((a, b) => b.path.length - a.path.length)[0];
}

export const PURE_ROOMS: readonly Room[] = ROOMS_TABLE.filter((room) => room.pure === true);

/** Why an import is against the table, in words, or null where it is allowed. */
export function violation({ from, to, typeOnly }: Import): string | null {
  const room = roomOf(from);
  if (room === undefined) return `${from} belongs to no room of the table`;
  const types = typeOnly ? (room.types ?? []) : [];
  if (/^(daemon|firmware-protocol|dashboards|test)\//.test(to)) {
    const allowed = [...room.rooms, ...types];
    const target = roomOf(to);
    if (target === room) return null;
    if (allowed.some((path) => opens(path, to))) return null;
    return `${from} imports ${to}; ${room.path} may import ${allowed.join(", ") || "no room"}`;
  }
  const name = packageOf(to);
  if (room.packages.includes(name) || types.includes(name)) return null;
  if (name.startsWith("node:") && room.packages.includes("node:*")) return null;
  return `${from} imports ${to}; ${room.path} may import ${room.packages.join(", ") || "no package"}`;
}

/** Whether an entry of the table opens that file. `daemon/link` does not open its transports. */
function opens(entry: string, to: string): boolean {
  if (to === entry) return true;
  if (entry === "daemon") return to.startsWith("daemon/");
  const isRoom = ROOMS_TABLE.some((room) => room.path === entry);
  if (isRoom) return roomOf(to)?.path === entry;
  return to.startsWith(entry) && /^[./]/.test(to.slice(entry.length));
}
