import { writeFileSync } from "node:fs";
import { parseArgs } from "node:util";
import type { Figure } from "./figure.ts";
import { judgeCost } from "./judge-cost.ts";
import { nightSpeed } from "./night-speed.ts";
import { pageSize } from "./page-size.ts";
import { reaction } from "./reaction.ts";
import { store } from "./store.ts";

/**
 * `npm run bench`: the figures, measured on this machine, reported and never asserted.
 *
 *   --json FILE      writes them as an array of {name, value, unit, peer?, ratio?}
 *   --only PREFIX    only the part whose names begin so: judge, demo, page, store, reaction, daemon
 */
const PARTS: readonly { readonly names: readonly string[]; run(): Figure[] | Promise<Figure[]> }[] =
  [
    { names: ["judge"], run: judgeCost },
    { names: ["demo"], run: nightSpeed },
    { names: ["page"], run: pageSize },
    { names: ["store"], run: store },
    { names: ["reaction", "daemon"], run: reaction },
  ];

const { values } = parseArgs({
  options: { json: { type: "string" }, only: { type: "string", default: "" } },
});
const { json, only } = values;
const wanted = PARTS.filter((part) =>
  part.names.some((name) => name.startsWith(only) || only.startsWith(name)),
);
if (wanted.length === 0) {
  process.stderr.write(
    `No part begins with "${only}". There are ${PARTS.flatMap((p) => p.names).join(", ")}.\n`,
  );
  process.exit(2);
}
const figures: Figure[] = [];
for (const part of wanted) {
  for (const figure of await part.run()) {
    if (!figure.name.startsWith(only)) continue;
    figures.push(figure);
    process.stdout.write(`${lineOf(figure)}\n`);
  }
}
if (json !== undefined) writeFileSync(json, `${JSON.stringify(figures, null, 2)}\n`);

function lineOf({ name, value, unit, peer, ratio }: Figure): string {
  const against = peer === undefined ? "" : `   ${(ratio ?? 0).toFixed(2)} x ${peer}`;
  return `${name.padEnd(24)} ${value.toPrecision(4).padStart(10)} ${unit}${against}`;
}
