import type { Case } from "./cases.ts";
import { sums } from "./sums.ts";
import { toController } from "./to-controller.ts";
import { toHost } from "./to-host.ts";

const SOURCE = "computed by the project's own codec, checked by two implementations";

const isPrintable = (line: string): boolean => /^[ -~]*$/.test(line);
const hexOf = (line: string): string => Buffer.from(line, "latin1").toString("hex");

const vectorOf = (c: Case): Record<string, unknown> => ({
  name: c.name,
  to: c.to,
  ...(isPrintable(c.line) ? { line: c.line } : { hex: hexOf(c.line) }),
  verdict: c.verdict,
  ...(c.verb === undefined ? {} : { verb: c.verb }),
  ...(c.fields === undefined ? {} : { fields: c.fields }),
});

const pages = (key: string, rows: readonly unknown[]): string =>
  `{\n  "source": ${JSON.stringify(SOURCE)},\n  ${JSON.stringify(key)}: [\n${rows
    .map((row) => `    ${JSON.stringify(row)}`)
    .join(",\n")}\n  ]\n}\n`;

/** Every vector file by its path under firmware-protocol/vectors, with its whole text. */
export const vectorFiles = (): [string, string][] => [
  ["to-controller.json", pages("vectors", toController.map(vectorOf))],
  ["to-host.json", pages("vectors", toHost.map(vectorOf))],
  ["sums/sums.json", pages("sums", sums)],
];
