import type { Browser } from "playwright-core";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { artefact, complaintsOf, type Look, launch, profile } from "./chromium.ts";
import { type StandIn, standIn } from "./stand-in.ts";
import type { Kind } from "./story.ts";

let browser: Browser;
beforeAll(async () => {
  browser = await launch();
});
afterAll(() => browser.close());

const PHONE = { width: 380, height: 800 };
const DESK = { width: 1280, height: 900 };
const WIDE = { width: 1920, height: 1080 };

const CASES: readonly [Kind, { width: number; height: number }, Look][] = [
  ["near", DESK, "day"],
  ["near", DESK, "night"],
  ["near", PHONE, "day"],
  ["near", WIDE, "day"],
  ["near", { width: 2560, height: 1440 }, "night"],
  ["held", DESK, "day"],
  ["calm", DESK, "day"],
  ["tripped", DESK, "night"],
  ["tripped", PHONE, "night"],
  ["standby", DESK, "day"],
  ["standby", PHONE, "day"],
];

describe("the Now page over an invented evening", () => {
  test.each(CASES)(
    "%s at %o by %s keeps its picture and says nothing amiss",
    async (kind, size, look) => {
      const desk: StandIn = await standIn(kind);
      const context = await profile(browser, size, look);
      const page = await context.newPage();
      const complaints = complaintsOf(page);
      try {
        await page.goto(`${desk.address}/sign?code=stand-in-code-0001`);
        await page.locator(".bs-ceiling").first().waitFor({ state: "attached" });
        await page.waitForFunction(
          () => document.querySelectorAll(".bs-tick, .bs-dotted").length > 0,
        );
        expect(await page.locator("h1").textContent()).toContain("north");
        const wide = await page.evaluate(() => document.documentElement.scrollWidth);
        expect(wide).toBeLessThanOrEqual(size.width);
        await page.screenshot({ path: artefact(`now-${size.width}-${look}-${kind}`) });
        expect(complaints).toEqual([]);
      } finally {
        await context.close();
        await desk.close();
      }
    },
  );
});
