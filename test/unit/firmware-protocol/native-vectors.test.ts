import { spawnSync } from "node:child_process";
import { readFileSync } from "node:fs";
import { join } from "node:path";
import { describe, expect, test } from "vitest";
import { packageRoot } from "../../../daemon/paths.ts";

/** A compiler under two sanitizers on a busy machine. */
const COMPILE_ms = 180_000;

const core = join(packageRoot, "firmware-protocol", "c");

interface Vector {
  readonly name: string;
  readonly line?: string;
  readonly hex?: string;
  readonly verdict: string;
  readonly verb?: string;
}

const vectors: readonly Vector[] = JSON.parse(
  readFileSync(join(packageRoot, "firmware-protocol", "vectors", "to-controller.json"), "utf8"),
).vectors;

const hexOf = (v: Vector): string => v.hex ?? Buffer.from(v.line ?? "", "latin1").toString("hex");
const wantedOf = (v: Vector): string => (v.verdict === "ok" ? `ok ${v.verb}` : v.verdict);

function make(target: string): string {
  const { status, stdout, stderr } = spawnSync("make", ["-s", "-C", core, target], {
    encoding: "utf8",
  });
  if (status !== 0) throw new Error(`make ${target} ended with ${status}:\n${stdout}${stderr}`);
  return stdout;
}

describe("the controller core, native, under ASan and UBSan", () => {
  test(
    "judges every golden line as the vectors say",
    () => {
      make("vectors");
      const { stdout, stderr, status } = spawnSync(join(core, "build", "vectors"), {
        input: `${vectors.map(hexOf).join("\n")}\n`,
        encoding: "utf8",
      });
      expect(stderr).toBe("");
      expect(status).toBe(0);
      const judged = stdout.trimEnd().split("\n");
      const named = (said: readonly string[]) => vectors.map((v, i) => `${v.name}: ${said[i]}`);
      expect(named(judged)).toEqual(named(vectors.map(wantedOf)));
      expect(judged.length).toBe(vectors.length);
    },
    COMPILE_ms,
  );

  test(
    "passes its own tests",
    () => {
      const closing = make("test").trimEnd().split("\n").at(-1) ?? "";
      expect(closing).toMatch(/^[1-9]\d* passed, 0 failed$/);
    },
    COMPILE_ms,
  );
});
