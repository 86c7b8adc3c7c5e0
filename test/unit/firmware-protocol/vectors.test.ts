import { readFileSync } from "node:fs";
import { join } from "node:path";
import { describe, expect, test } from "vitest";
import { packageRoot } from "../../../daemon/paths.ts";
import { readLine, VERBS } from "../../../firmware-protocol/messages.ts";
import { vectorFiles } from "../../vectors/files.ts";
import { secondJudge } from "./second-judge.ts";

interface Vector {
  readonly name: string;
  readonly to: "controller" | "host";
  readonly line?: string;
  readonly hex?: string;
  readonly verdict: string;
  readonly verb?: string;
  readonly fields?: Readonly<Record<string, unknown>>;
}

const folder = join(packageRoot, "firmware-protocol", "vectors");
const vectors: Vector[] = ["to-controller.json", "to-host.json"].flatMap(
  (file) => JSON.parse(readFileSync(join(folder, file), "utf8")).vectors,
);
const lineOf = (v: Vector): string => v.line ?? Buffer.from(v.hex ?? "", "hex").toString("latin1");

const verdictOf = (line: string, to: Vector["to"]): string => {
  const judged = readLine(line, to);
  if (judged.kind === "message") return "ok";
  return judged.kind === "dark" ? "dark" : judged.broken;
};

describe("golden lines", () => {
  test("the files are what the cases make", () => {
    for (const [name, text] of vectorFiles()) {
      expect(readFileSync(join(folder, name), "utf8"), `${name}: run test/vectors/make`).toBe(text);
    }
  });

  test("names are unique per side", () => {
    const names = vectors.map((v) => `${v.to}: ${v.name}`);
    expect(new Set(names).size).toBe(names.length);
  });

  test.each(vectors)("$to: $name", (v) => {
    const line = lineOf(v);
    expect(verdictOf(line, v.to)).toBe(v.verdict);
    expect(secondJudge(line, v.to)).toBe(v.verdict);
    const judged = readLine(line, v.to);
    if (judged.kind === "message") {
      expect(judged.verb).toBe(v.verb);
      expect(judged.fields).toEqual(v.fields);
    }
  });

  test("at least 150 lines, and each verb has three valid and three broken ones", () => {
    expect(vectors.length).toBeGreaterThanOrEqual(150);
    for (const verb of VERBS) {
      const own = vectors.filter((v) => v.verb === verb);
      expect(own.filter((v) => v.verdict === "ok").length, verb).toBeGreaterThanOrEqual(3);
      expect(own.filter((v) => v.verdict !== "ok").length, verb).toBeGreaterThanOrEqual(3);
    }
  });
});
