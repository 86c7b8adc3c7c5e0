import { basename, dirname } from "node:path";
import { fileURLToPath, pathToFileURL } from "node:url";

/**
 * Where the parts of this package lie: the one place that makes file URLs.
 *
 * Code runs either from dist/ or, in unit tests, from the TypeScript sources; both trees have the
 * same shape. Workers and child processes always run from dist/, also when the caller does not.
 */
const tree = dirname(dirname(fileURLToPath(import.meta.url)));

/** Folder of the checkout, holding package.json. */
export const packageRoot: string = basename(tree) === "dist" ? dirname(tree) : tree;

/** Folder of everything that was built. */
export const distRoot: string = `${packageRoot}/dist`;

/** Folder of the built pages. */
export const pagesRoot: string = `${distRoot}/pages`;

/**
 * A file read while running, by its path in the checkout, such as
 * `firmware-protocol/wasm/core.wasm`. Taken from the tree that runs, so unit tests need no build.
 */
export const assetFile = (path: string): URL => pathToFileURL(`${tree}/${path}`);

/** A compiled program, by its path below dist/, such as `daemon/cli/main.js`. */
export const builtFile = (path: string): URL => pathToFileURL(`${distRoot}/${path}`);

/** The entry of a room that runs in a worker or process of its own. */
export const workerFile = (room: string): URL => builtFile(`daemon/${room}/worker.js`);
