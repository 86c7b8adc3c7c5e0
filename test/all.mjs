/**
 * `npm test`: installs what is missing, builds, and runs every check. `--quick` runs only those that
 * need no other program. The last line is `N passed, N failed, N skipped`, over everything.
 *
 * Node built-ins only: on a fresh machine this runs before npm has installed anything.
 */
import { readFileSync } from "node:fs";
import { NotReady, say } from "../daemon/ready/say.mjs";
import { ready } from "../daemon/ready.mjs";
import { add, closingLine, noCounts } from "./all/counts.mjs";
import { QUICK, SUITES } from "./all/suites.mjs";
import { installSystemPackages } from "./all/system.mjs";

const budgets = JSON.parse(readFileSync(new URL("budgets.json", import.meta.url), "utf8"));
/** No suite is taken for hung before this, however slow the machine. */
const HUNG_ms = 600_000;
const quick = process.argv.includes("--quick");

/** Installs and builds; a failure is counted, and what can run without a build still runs. */
async function prepare() {
  try {
    await ready();
    return { passed: 1, failed: 0, skipped: 0 };
  } catch (error) {
    if (!(error instanceof NotReady)) throw error;
    say(error.message);
    say(error.remedy);
    return { passed: 0, failed: 1, skipped: 0 };
  }
}

function report(results, notTested) {
  console.log("\nsuite        seconds  budget");
  for (const { name, seconds } of results) {
    const { budget_s } = budgets.suites[name];
    const over = seconds > budget_s ? "  over its budget" : "";
    console.log(
      `${name.padEnd(12)} ${seconds.toFixed(0).padStart(7)} ${String(budget_s).padStart(7)}${over}`,
    );
  }
  const whole_s = results.reduce((sum, { seconds }) => sum + seconds, 0);
  const over = whole_s > budgets.whole_s ? "  over its budget" : "";
  console.log(
    `${"whole".padEnd(12)} ${whole_s.toFixed(0).padStart(7)} ${String(budgets.whole_s).padStart(7)}${over}`,
  );
  for (const what of notTested) console.log(`not tested: ${what}`);
}

const missing = quick ? new Set() : await installSystemPackages();
const total = await prepare();
const results = [];
const notTested = [];
for (const suite of quick ? QUICK : SUITES) {
  const lacking = suite.needs.filter((name) => missing.has(name));
  if (lacking.length > 0) {
    notTested.push(`${suite.covers} (needs ${lacking.join(", ")})`);
    continue;
  }
  console.log(`\n--- ${suite.name} ---`);
  const begun = performance.now();
  const counts = noCounts();
  const limit_ms = Math.max(HUNG_ms, budgets.suites[suite.name].budget_s * 4000);
  for (const step of suite.steps()) add(counts, await step(limit_ms));
  results.push({ name: suite.name, seconds: (performance.now() - begun) / 1000 });
  add(total, counts);
}
if (!quick) report(results, notTested);
if (notTested.length > 0 && process.env.CI) {
  console.log("With CI set, what is not tested counts as failed.");
  total.failed += notTested.length;
}
process.exitCode = total.failed > 0 ? 1 : 0;
console.log(closingLine(total));
