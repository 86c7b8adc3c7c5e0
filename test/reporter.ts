import type { Reporter, SerializedError, TestModule } from "vitest/node";

interface Counts {
  passed: number;
  failed: number;
  skipped: number;
}

/** A file that cannot be imported, or an error outside any test, is one failure. */
export function countModule(module: TestModule, counts: Counts): void {
  counts.failed += module.errors().length;
  for (const suite of module.children.allSuites()) counts.failed += suite.errors().length;
  for (const test of module.children.allTests()) {
    const { state } = test.result();
    if (state === "passed") counts.passed++;
    else if (state === "skipped") counts.skipped++;
    else counts.failed++;
  }
}

/**
 * Closes the run with `N passed, N failed, N skipped`. Written as the process exits, so that it is
 * the last line whatever other reporters print.
 */
export class ClosingLine implements Reporter {
  readonly #counts: Counts = { passed: 0, failed: 0, skipped: 0 };

  onInit(): void {
    process.on("exit", () => {
      const { passed, failed, skipped } = this.#counts;
      process.stdout.write(`${passed} passed, ${failed} failed, ${skipped} skipped\n`);
      if (failed > 0) process.exitCode = 1;
    });
  }

  onTestRunEnd(modules: readonly TestModule[], unhandled: readonly SerializedError[]): void {
    this.#counts.failed += unhandled.length;
    for (const module of modules) countModule(module, this.#counts);
  }
}
