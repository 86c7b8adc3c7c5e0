import { spawnSync } from "node:child_process";
import { existsSync } from "node:fs";
import { onPath } from "../../daemon/ready/install.mjs";
import { say } from "../../daemon/ready/say.mjs";

const header = (path) => () => existsSync(path);
const program =
  (...names) =>
  () =>
    names.some(onPath);

/** System packages by their Debian name, and how each is recognised however it was installed. */
const PACKAGES = {
  "g++": program("g++"),
  make: program("make"),
  python3: program("python3"),
  gcc: program("gcc"),
  git: program("git"),
  "gcc-avr": program("avr-gcc"),
  "avr-libc": header("/usr/lib/avr/include/avr/io.h"),
  "binutils-avr": program("avr-objdump"),
  simavr: program("simavr"),
  "libsimavr-dev": header("/usr/include/simavr/sim_avr.h"),
  "libelf-dev": header("/usr/include/libelf.h"),
  "clang-14": program("clang-14"),
  "lld-14": program("wasm-ld-14"),
  chromium: program("chromium", "chromium-browser", "google-chrome"),
  socat: program("socat"),
  influxdb: program("influxd"),
  "victoria-metrics": program("victoria-metrics"),
  openssl: program("openssl"),
};

const missingNow = () => Object.keys(PACKAGES).filter((name) => !PACKAGES[name]());

function aptGet(...args) {
  const env = { ...process.env, DEBIAN_FRONTEND: "noninteractive" };
  return spawnSync("apt-get", args, { env, stdio: ["ignore", 2, 2] }).status === 0;
}

/**
 * Installs the system packages that tests need, where this process may, and returns the set of
 * those that are still missing. Without the right to install it only names them.
 */
export async function installSystemPackages() {
  const missing = missingNow();
  if (missing.length === 0) return new Set();
  if (process.getuid?.() !== 0 || !onPath("apt-get")) {
    say(`missing system packages: ${missing.join(" ")}`);
    say(`on Debian or Ubuntu: sudo apt-get install ${missing.join(" ")}`);
    return new Set(missing);
  }
  say(`installing system packages: ${missing.join(" ")}`);
  if (!aptGet("update")) say("apt-get update failed; trying with the lists that are here");
  const install = ["install", "-y", "--no-install-recommends"];
  if (!aptGet(...install, ...missing)) {
    // One unknown name fails the whole list, so each is tried by itself.
    for (const name of missing) aptGet(...install, name);
  }
  const still = missingNow();
  if (still.length > 0) say(`could not be installed: ${still.join(" ")}`);
  return new Set(still);
}
