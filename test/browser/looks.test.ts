import type { Browser, Page } from "playwright-core";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { artefact, complaintsOf, type Look, launch, profile } from "./chromium.ts";
import { standIn } from "./stand-in.ts";
import type { Kind } from "./story.ts";

let browser: Browser;
beforeAll(async () => {
  browser = await launch();
});
afterAll(() => browser.close());

const PHONE = { width: 380, height: 800 };
const DESK = { width: 1280, height: 900 };

const CASES: readonly [Kind, { width: number; height: number }, Look][] = [
  ["near", { width: 1920, height: 1080 }, "day"],
  ["near", PHONE, "day"],
  ["tripped", DESK, "night"],
  ["held", { width: 2560, height: 1440 }, "night"],
  ["standby", PHONE, "day"],
];

describe("the Now page over an invented evening", () => {
  test.each(CASES)("%s at %o by %s fits and says nothing amiss", async (kind, size, look) => {
    const desk = await standIn(kind);
    const context = await profile(browser, size, look);
    const page = await context.newPage();
    const complaints = complaintsOf(page);
    try {
      await page.goto(`${desk.address}/sign?code=stand-in-code-0001`);
      await page.locator(".bs-ceiling").nth(2).waitFor({ state: "attached" });
      expect(await page.locator("h1").textContent()).toContain("north");
      const wide = await page.evaluate(() => document.documentElement.scrollWidth);
      expect(wide).toBeLessThanOrEqual(size.width);
      await page.screenshot({ path: artefact(`now-${size.width}-${look}-${kind}`) });
      await expectFirstLook(page, size);
      expect(complaints).toEqual([]);
    } finally {
      await context.close();
      await desk.close();
    }
  });

  test("after 2 s without news the numbers are hatched and say their age", async () => {
    const desk = await standIn("near", true);
    const context = await profile(browser, DESK);
    const page = await context.newPage();
    try {
      await page.goto(`${desk.address}/sign?code=stand-in-code-0001`);
      await page.locator("h1", { hasText: "Nothing heard from north for" }).waitFor();
      expect(await page.locator(".bs-picture text", { hasText: /^\d+\ss old$/ }).count()).toBe(1);
      expect(await page.locator(".bs-picture text", { hasText: "no forecast" }).count()).toBe(1);
      await page.screenshot({ path: artefact("now-1280-day-silent") });
    } finally {
      await context.close();
      await desk.close();
    }
  });
});

/** Sentence, what comes next, the whole picture and Dark are in sight without scrolling. */
async function expectFirstLook(page: Page, size: { height: number }): Promise<void> {
  for (const part of ["h1", ".bs-next", ".bs-picture", ".bs-dark"]) {
    const box = await page.locator(part).boundingBox();
    expect(box?.y ?? -1, part).toBeGreaterThanOrEqual(0);
    expect((box?.y ?? 0) + (box?.height ?? 0), part).toBeLessThanOrEqual(size.height);
  }
}
