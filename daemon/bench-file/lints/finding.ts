import type { Finding, Path } from "../problem.ts";
import type { LintCode } from "./catalogue.ts";

type Words = Omit<Finding, "level" | "code" | "path">;

export const error = (code: LintCode, path: Path, words: Words): Finding => ({
  level: "error",
  code,
  path,
  ...words,
});

export const warning = (code: LintCode, path: Path, words: Words): Finding => ({
  level: "warning",
  code,
  path,
  ...words,
});
