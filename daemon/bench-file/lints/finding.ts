import type { Finding, Path } from "../problem.ts";

type Words = Omit<Finding, "level" | "code" | "path">;

export const error = (code: string, path: Path, words: Words): Finding => ({
  level: "error",
  code,
  path,
  ...words,
});

export const warning = (code: string, path: Path, words: Words): Finding => ({
  level: "warning",
  code,
  path,
  ...words,
});
