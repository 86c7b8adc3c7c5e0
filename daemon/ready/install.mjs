import { createHash } from "node:crypto";
import { existsSync, readFileSync, writeFileSync } from "node:fs";
import { delimiter, join } from "node:path";
import { NotReady, root, runTool, say } from "./say.mjs";

const STAMP = join(root, "node_modules", ".beamsitter-install");
const LOCKFILE = join(root, "package-lock.json");
/** What npm itself writes down of an installed tree. */
const INSTALLED = join(root, "node_modules", ".package-lock.json");

/** Compiled parts are tied to Node's version and the processor, so both are in the stamp. */
function wantedStamp() {
  const hash = createHash("sha256").update(readFileSync(LOCKFILE));
  return hash.update(`${process.version} ${process.platform} ${process.arch}`).digest("hex");
}

/** Whether a program of that name is on the PATH. */
export const onPath = (name) =>
  (process.env.PATH ?? "").split(delimiter).some((folder) => existsSync(join(folder, name)));

const COMPILERS = ["g++", "make", "python3"];
const missingCompilers = () => COMPILERS.filter((name) => !onPath(name));

const compilerAdvice = (missing) =>
  `better-sqlite3 is compiled while installing and needs ${missing.join(", ")}, not found here. ` +
  "On Debian or Ubuntu: sudo apt-get install g++ make python3";

/**
 * Whether npm already installed exactly the lockfile, for instance by a plain `npm ci`.
 * Packages for other systems are left out by npm and not looked for.
 */
function treeAgrees() {
  if (!existsSync(INSTALLED)) return false;
  const wanted = JSON.parse(readFileSync(LOCKFILE, "utf8")).packages;
  const found = JSON.parse(readFileSync(INSTALLED, "utf8")).packages;
  return Object.entries(wanted).every(
    ([path, entry]) => path === "" || entry.optional || found[path]?.version === entry.version,
  );
}

/** Loads the compiled packages in another process: a wrong one would end this one. */
async function compiledPartsLoad() {
  const script = "new (require('better-sqlite3'))(':memory:').close(); require('serialport');";
  return (await runTool("trying the compiled packages", process.execPath, ["-e", script])) === 0;
}

async function npmCi() {
  const missing = missingCompilers();
  say("installing the packages of package-lock.json (npm ci), about a minute the first time");
  if (missing.length > 0) say(compilerAdvice(missing));
  const args = ["ci", "--include=dev", "--no-audit", "--no-fund", "--loglevel=error"];
  if ((await runTool("installing", "npm", args)) === 0) return;
  throw new NotReady(
    "npm ci failed; its own message stands above.",
    missing.length > 0 ? compilerAdvice(missing) : "Mend what it names and run the command again.",
  );
}

/** The step that installs npm packages. */
export const install = {
  isDone: () => existsSync(STAMP) && readFileSync(STAMP, "utf8") === wantedStamp(),

  async run() {
    if (!treeAgrees() || !(await compiledPartsLoad())) {
      await npmCi();
      if (!(await compiledPartsLoad())) {
        throw new NotReady(
          "better-sqlite3 or serialport is installed but cannot be loaded.",
          "If npm is set to ignore scripts, run: npm rebuild better-sqlite3 @serialport/bindings-cpp",
        );
      }
    }
    writeFileSync(STAMP, wantedStamp());
  },
};
