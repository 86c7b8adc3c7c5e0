import { defineConfig } from "vitest/config";
import { ClosingLine } from "./test/reporter.ts";

/** Nothing here waits longer than this without a time-out of its own. */
const UNIT_MS = 20_000;
const PROCESS_MS = 120_000;

export default defineConfig({
  test: {
    reporters: ["default", new ClosingLine()],
    passWithNoTests: true,
    projects: [
      {
        test: {
          name: "unit",
          include: ["test/{unit,published,architecture}/**/*.test.{ts,tsx}"],
          pool: "threads",
          testTimeout: UNIT_MS,
        },
      },
      {
        test: {
          name: "process",
          include: ["test/{process,hardware}/**/*.test.ts"],
          pool: "forks",
          fileParallelism: false,
          testTimeout: PROCESS_MS,
          hookTimeout: PROCESS_MS,
          globalSetup: ["test/built.ts"],
        },
      },
      {
        test: {
          name: "browser",
          include: ["test/browser/**/*.test.ts"],
          pool: "forks",
          fileParallelism: false,
          testTimeout: PROCESS_MS,
          hookTimeout: PROCESS_MS,
          globalSetup: ["test/built.ts"],
        },
      },
    ],
  },
});
