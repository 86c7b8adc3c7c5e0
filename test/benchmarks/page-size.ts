import { readdirSync, readFileSync } from "node:fs";
import { join } from "node:path";
import { gzipSync } from "node:zlib";
import { pagesRoot } from "../../daemon/paths.ts";
import type { Figure } from "./figure.ts";

/** Everything a browser fetches for the Now page, each file packed by itself, in kB. */
export function pageSize(): Figure[] {
  const files = readdirSync(pagesRoot, { recursive: true, withFileTypes: true }).filter(
    (f) => f.isFile() && /\.(html|js|css|svg)$/.test(f.name),
  );
  const bytes = files.reduce(
    (sum, f) => sum + gzipSync(readFileSync(join(f.parentPath, f.name)), { level: 9 }).length,
    0,
  );
  return [{ name: "page.now.gzipKb", value: bytes / 1000, unit: "kB" }];
}
