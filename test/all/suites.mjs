import { existsSync } from "node:fs";
import { join } from "node:path";
import { root } from "../../daemon/ready/say.mjs";
import { runAndCount } from "./counts.mjs";

const bin = (name) => join("node_modules", ".bin", name);
const run =
  (what, command, ...args) =>
  (limit_ms) =>
    runAndCount(what, command, args, limit_ms);

const biome = run("style", bin("biome"), "check", "--error-on-warnings", ".");
const types = run("types", bin("tsc"), "--noEmit", "-p", "tsconfig.json");
const unused = run("unused code", bin("knip"));
const vitest = (what, project, ...filters) =>
  run(what, bin("vitest"), "run", "--project", project, ...filters);

/** A make target, where that Makefile exists. */
const make = (what, folder, ...targets) =>
  existsSync(join(root, folder, "Makefile")) ? [run(what, "make", "-C", folder, ...targets)] : [];

/** Unit tests that compile C; they belong to the core's suite, so that the rest needs no compiler. */
const COMPILING = [
  "test/architecture/core-object.test.ts",
  "test/unit/firmware-protocol/native-vectors.test.ts",
];
const withoutCompiling = COMPILING.flatMap((file) => ["--exclude", file]);
const COMPILERS = ["gcc", "make"];
const AVR = ["gcc-avr", "avr-libc", "binutils-avr", "libsimavr-dev", "libelf-dev"];

/** Tests that run a real time-series server; they make a suite of their own. */
const SERVERS = ["daemon", "outage", "reader", "victoria"].map(
  (name) => `test/process/influx-${name}.test.ts`,
);
const withoutServers = SERVERS.flatMap((file) => ["--exclude", file]);

/**
 * Every suite: what it covers in words, the system packages it cannot do without, and its steps.
 * A suite whose packages are missing is named as not tested.
 */
export const SUITES = [
  {
    name: "static",
    covers: "style, types and unused code",
    needs: [],
    steps: () => [biome, types, unused],
  },
  {
    name: "core",
    covers: "the controller core and its firmware",
    needs: [...COMPILERS, "gcc-avr", "avr-libc", "binutils-avr"],
    steps: () => [
      ...make("the core, natively", "firmware-protocol/c", "test"),
      ...make("the firmware", "firmware-protocol/boards/atmega328p"),
      vitest("tests that compile the core", "unit", ...COMPILING),
    ],
  },
  {
    name: "unit",
    covers: "every room by itself, published values, architecture",
    needs: [],
    steps: () => [vitest("unit tests", "unit", ...withoutCompiling)],
  },
  {
    name: "process",
    covers: "the daemon and its commands as processes",
    needs: [],
    steps: () => [vitest("process tests", "process", "test/process", ...withoutServers)],
  },
  {
    name: "second home",
    covers: "the record at a real InfluxDB and a real VictoriaMetrics",
    needs: ["influxdb", "victoria-metrics", "openssl"],
    steps: () => [vitest("tests of the second home", "process", ...SERVERS)],
  },
  {
    name: "hardware",
    covers: "the firmware on a simulated processor",
    needs: [...COMPILERS, ...AVR],
    steps: () => [
      ...make("the simulated board", "test/hardware/simavr"),
      vitest("hardware tests", "process", "test/hardware"),
    ],
  },
  {
    name: "browser",
    covers: "the pages in a browser",
    needs: ["chromium"],
    steps: () => [vitest("browser tests", "browser")],
  },
];

/** What `npm run check` runs: no compiler, no browser, no process. */
export const QUICK = [
  { name: "static", covers: "style and types", needs: [], steps: () => [biome, types] },
  {
    name: "unit",
    covers: "unit and architecture tests",
    needs: [],
    steps: () => [
      vitest("unit tests", "unit", "test/unit", "test/architecture", ...withoutCompiling),
    ],
  },
];
