import { defineConfig } from "vitest/config";
import { ClosingLine } from "./test/reporter.ts";

/** Nothing here waits longer than this without a time-out of its own. */
const unit_ms = 20_000;
const process_ms = 120_000;

export default defineConfig({
  test: {
    reporters: ["default", new ClosingLine()],
    projects: [
      {
        test: {
          name: "unit",
          include: ["test/{unit,published,architecture}/**/*.test.{ts,tsx,mjs}"],
          pool: "threads",
          testTimeout: unit_ms,
        },
      },
      {
        test: {
          name: "process",
          include: ["test/{process,hardware}/**/*.test.ts"],
          pool: "forks",
          fileParallelism: false,
          testTimeout: process_ms,
          hookTimeout: process_ms,
          globalSetup: ["test/built.ts"],
        },
      },
      {
        test: {
          name: "browser",
          include: ["test/browser/**/*.test.ts"],
          pool: "forks",
          fileParallelism: false,
          testTimeout: process_ms,
          hookTimeout: process_ms,
          globalSetup: ["test/built.ts"],
        },
      },
    ],
  },
});
