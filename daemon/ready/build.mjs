import { createHash } from "node:crypto";
import {
  copyFileSync,
  existsSync,
  mkdirSync,
  readdirSync,
  readFileSync,
  rmSync,
  statSync,
  writeFileSync,
} from "node:fs";
import { dirname, join } from "node:path";
import { NotReady, root, runTool, say } from "./say.mjs";

const DIST = join(root, "dist");
const ROOMS = ["daemon", "firmware-protocol", "dashboards", "test"];
const SKIPPED = new Set(["build", "node_modules", "artefacts", "coverage"]);

/** Files that programs read while running; they lie in dist/ at the same path as in the checkout. */
const isAsset = (path) =>
  !path.startsWith("dashboards/") && /\.(ya?ml|sql|wasm|json|csv|txt)$/.test(path);
const isCode = (path) => /(?<!\.d)\.tsx?$/.test(path);
const isPage = (path) => /^(dashboards|daemon\/model|daemon\/desk)\//.test(path);

/** Every file below a folder of the checkout, as paths with forward slashes, sorted. */
function* filesBelow(folder) {
  const here = join(root, folder);
  if (!existsSync(here)) return;
  const entries = readdirSync(here, { withFileTypes: true });
  for (const entry of entries.sort((a, b) => (a.name < b.name ? -1 : 1))) {
    const path = `${folder}/${entry.name}`;
    if (entry.isDirectory()) {
      if (!SKIPPED.has(entry.name)) yield* filesBelow(path);
    } else if (entry.isFile()) yield path;
  }
}

/** One hash over names, sizes and times: also sees a file that went away or became older. */
function stampOf(files) {
  const hash = createHash("sha256");
  for (const path of [...files, "tsconfig.json", "package-lock.json"]) {
    const { size, mtimeMs } = statSync(join(root, path));
    hash.update(`${path} ${size} ${mtimeMs}\n`);
  }
  return hash.digest("hex");
}

/**
 * The parts of a build. `make` resolves to null, or to what went wrong, in words. Each has a stamp of its own in dist/, so that only
 * what changed is made.
 */
const PARTS = [
  { stamp: ".code-stamp", sees: (path) => isCode(path) || isAsset(path), make: makeCode },
  { stamp: ".pages-stamp", sees: isPage, make: makePages },
];

function isFresh(part, files) {
  const file = join(DIST, part.stamp);
  return existsSync(file) && readFileSync(file, "utf8") === stampOf(files.filter(part.sees));
}

const allFiles = () => ROOMS.flatMap((room) => [...filesBelow(room)]);

async function makeCode(files) {
  const outputs = new Set();
  for (const path of files.filter(isCode)) {
    const out = path.replace(/\.tsx?$/, ".js");
    outputs.add(out).add(`${out}.map`);
  }
  for (const path of files.filter(isAsset)) {
    copyAsset(path);
    outputs.add(path);
  }
  const tsc = join(root, "node_modules", "typescript", "bin", "tsc");
  const code = await runTool("compiling", process.execPath, [tsc, "-p", "tsconfig.json"]);
  removeLeftovers(outputs);
  return code === 0
    ? null
    : "The TypeScript sources do not compile; the compiler's messages stand above.";
}

function copyAsset(path) {
  const to = join(DIST, path);
  mkdirSync(dirname(to), { recursive: true });
  copyFileSync(join(root, path), to);
}

/** Takes away what earlier builds made from files that are gone: nothing may import it any more. */
function removeLeftovers(outputs) {
  for (const room of ROOMS) {
    for (const path of filesBelow(`dist/${room}`)) {
      const source = path.slice("dist/".length);
      if (!outputs.has(source)) rmSync(join(root, path));
    }
  }
}

async function makePages() {
  if (!existsSync(join(root, "dashboards", "index.html"))) return null;
  const vite = join(root, "node_modules", "vite", "bin", "vite.js");
  const to = ["--outDir", join(DIST, "pages"), "--emptyOutDir"];
  const args = [vite, "build", "dashboards", ...to, "--logLevel", "warn"];
  const code = await runTool("building the pages", process.execPath, args);
  return code === 0 ? null : "The pages do not build; the message of vite stands above.";
}

/** The step that fills dist/. */
export const build = {
  isDone() {
    const files = allFiles();
    return PARTS.every((part) => isFresh(part, files));
  },

  async run() {
    say("building dist/");
    mkdirSync(DIST, { recursive: true });
    const files = allFiles();
    const failures = [];
    for (const part of PARTS) {
      if (isFresh(part, files)) continue;
      // Stamped with what was read before compiling: a file saved meanwhile is built next time.
      const stamp = stampOf(files.filter(part.sees));
      const failure = await part.make(files.filter(part.sees));
      if (failure === null) writeFileSync(join(DIST, part.stamp), stamp);
      else failures.push(failure);
    }
    // One failure does not hide another: the pages are tried even where the code is broken.
    if (failures.length > 0) {
      throw new NotReady(
        failures.join(" "),
        "If you changed nothing, this checkout is broken: take another commit.",
      );
    }
  },
};
