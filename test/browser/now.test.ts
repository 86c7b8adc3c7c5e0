import { mkdtempSync, readFileSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import axe from "axe-core";
import type { Browser, BrowserContext, Page } from "playwright-core";
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from "vitest";
import type { Snapshot } from "../../daemon/control/api.ts";
import { assetFile } from "../../daemon/paths.ts";
import { artefact, complaintsOf, launch, profile } from "./chromium.ts";
import { type RunningDaemon, startDaemon } from "./daemon.ts";

const SIZE = { width: 1280, height: 900 };
/** The machine may be busy; nothing here is a promise about time. */
const SLOW_ms = 30_000;

let browser: Browser;
let daemon: RunningDaemon;
let context: BrowserContext;
let page: Page;

beforeAll(async () => {
  [browser, daemon] = await Promise.all([launch(), startDaemon("--stay-dark")]);
});
afterAll(async () => {
  await browser.close();
  await daemon.stop();
});

beforeEach(async () => {
  context = await profile(browser, SIZE);
  page = await context.newPage();
  page.setDefaultTimeout(SLOW_ms);
});
afterEach(async () => {
  await context.close();
  const client = await daemon.connect();
  await client.ask({ verb: "dark", asker: "person" });
  client.close();
});

/** What the switch says, by a way that is not the page's. */
async function status(): Promise<Snapshot> {
  const client = await daemon.connect();
  const answer = await client.ask({ verb: "status" });
  client.close();
  if (answer.snapshot === undefined) throw new Error(`status gave no snapshot: ${answer.words}`);
  return answer.snapshot;
}

/** A fresh address that signs one browser in, as `beamsitter open` gets it. */
async function freshAddress(): Promise<string> {
  const client = await daemon.connect();
  const { address, words } = await client.ask({ verb: "sign" });
  client.close();
  if (address === undefined) throw new Error(`no address to sign in with: ${words}`);
  return address;
}

async function signIn(): Promise<void> {
  await page.goto(await freshAddress());
  await page.locator("h1", { hasText: "ready" }).waitFor();
}

async function shoot(name: string): Promise<void> {
  await page.evaluate(() => scrollTo(0, 0));
  await page.screenshot({ path: artefact(name) });
}

async function armAt(text: string): Promise<void> {
  await page.getByLabel("To arm, type the current you mean.").fill(text);
  await page.getByRole("button", { name: /^Arm at/ }).click();
}

const emitting = (): Promise<void> => page.locator("h1", { hasText: "emitting" }).waitFor();

describe("the Now page on the built-in bench", () => {
  test("a stranger sees how to sign in; the printed address signs one browser in, once", async () => {
    await page.goto(daemon.origin);
    expect(await page.locator("h1").textContent()).toContain("not signed in");
    expect(await page.locator("main").textContent()).toContain("beamsitter open");
    const address = await freshAddress();
    await page.goto(address);
    await page.locator("h1", { hasText: "ready" }).waitFor();
    expect(new URL(page.url()).search).toBe("");
    const cookie = (await context.cookies())[0];
    expect(cookie).toMatchObject({ httpOnly: true, sameSite: "Strict" });

    const stranger = await profile(browser, SIZE);
    const second = await stranger.newPage();
    await second.goto(address);
    expect(await second.locator("h1").textContent()).toContain("used already");
    await stranger.close();
  });

  test("arm, see the corridor, set, go dark by the key, all by what the page shows", async () => {
    const complaints = complaintsOf(page);
    await signIn();
    await page.getByLabel("To arm, type the current you mean.").fill("2.5");
    expect(await page.locator(".bs-read--refused").textContent()).toContain("above the ceiling");
    expect(await page.getByRole("button", { name: /^Arm at/ }).count()).toBe(0);

    await page.getByLabel("To arm, type the current you mean.").fill("1.2");
    expect(await page.locator(".bs-read").textContent()).toMatch(/^I mean 1\.20\sA/);
    await page.getByRole("button", { name: "Arm at 1.20\u00a0A" }).click();
    await emitting();
    await page.locator("h1", { hasText: "as asked" }).waitFor();
    expect((await status()).asked_mA).toBe(1200);
    const label = (await page.getByRole("img").getAttribute("aria-label")) ?? "";
    expect(label).toContain("north is emitting");
    for (const part of [".bs-ceiling", ".bs-floor", ".bs-current"]) {
      expect(await page.locator(`.bs-picture ${part}`).count()).toBeGreaterThan(0);
    }

    await page.getByLabel("Another current? Type the one you mean.").fill("1,0");
    await page.getByRole("button", { name: "Set 1.00\u00a0A" }).click();
    await page.locator("h1", { hasText: /1\.00\sA as asked/ }).waitFor();

    await page.keyboard.press("Escape");
    await page.keyboard.press("d");
    await page.locator("h1", { hasText: "ready" }).waitFor();
    await page.locator(".bs-dark", { hasText: "both said so" }).waitFor();
    expect(await page.locator(".bs-dark-said").textContent()).toMatch(
      /the switch confirmed it at \d\d:\d\d:\d\d; the second way confirmed it at/,
    );
    expect((await status()).state).toBe("standby");
    await shoot("daemon-after-dark");
    expect(complaints).toEqual([]);
  });

  test("with the desk stopped, Dark goes the second way and says so; then the page comes back", async () => {
    await signIn();
    await armAt("1.2");
    await emitting();
    process.kill(daemon.deskPid(), "SIGSTOP");
    await page.getByRole("button", { name: /^Dark/ }).click();
    await page.locator(".bs-dark", { hasText: "second way said so" }).waitFor();
    expect((await status()).state).toBe("standby");
    await page.locator(".bs-dark-said", { hasText: "the switch did not answer" }).waitFor();
    await shoot("daemon-desk-stopped");
    // The daemon ends the hung desk and starts another; this page comes back to it by itself.
    await page.locator("h1", { hasText: "ready" }).waitFor();
  });

  test("keys move the cursor, and it reads a sentence", async () => {
    await signIn();
    await page.locator(".bs-picture").focus();
    await page.keyboard.press("ArrowLeft");
    await page.locator("#bs-cursor", { hasText: /\d\d:\d\d:\d\d: .*case/ }).waitFor();
    const label = page.locator(".bs-picture text", { hasText: /^\+\d+\smin$|no forecast/ });
    expect(await label.count()).toBe(1);
    await page.keyboard.press("Escape");
    await page.locator("#bs-cursor:empty").waitFor({ state: "attached" });
  });

  test.each(["day", "night"] as const)(
    "by %s nothing is hidden from a screen reader",
    async (look) => {
      await page.emulateMedia({ colorScheme: look === "night" ? "dark" : "light" });
      await signIn();
      await page.getByLabel("To arm, type the current you mean.").fill("1.2");
      // The page's policy allows no inline script; the debugger's own way in is not bound by it.
      await page.evaluate(axe.source);
      const violations = await page.evaluate(async () => {
        const { axe } = globalThis as unknown as {
          axe: {
            run(): Promise<{ violations: { id: string; impact: string; nodes: object[] }[] }>;
          };
        };
        return (await axe.run()).violations.map((v) => ({ ...v, nodes: v.nodes.length }));
      });
      const serious = violations.filter((v) => v.impact === "serious" || v.impact === "critical");
      expect(serious).toEqual([]);
    },
  );

  test("the look is kept, and is called day or night", async () => {
    await signIn();
    await page.getByRole("button", { name: "Night" }).click();
    await page.reload();
    await page.getByRole("button", { name: "Day" }).waitFor();
    expect(await page.locator("html").getAttribute("data-look")).toBe("night");
  });
});

describe("after a trip", () => {
  test("there is no field until the reset has named the cause", async () => {
    const tripping = await startDaemon("--stay-dark", "--bench", benchThatTrips());
    try {
      await page.goto(tripping.address);
      await page.locator("#bs-current").waitFor();
      await armAt("1.8");
      await emitting();
      await page.locator("h1", { hasText: "went dark because" }).waitFor();
      await page.locator("h1 .bs-trip", { hasText: "the case passed its limit" }).waitFor();
      expect(await page.locator("#bs-current").count()).toBe(0);
      expect(await page.getByRole("alert").textContent()).toContain("went dark");
      await shoot("daemon-tripped");
      const reset = page.getByRole("button", { name: "Reset, naming: the case passed its limit" });
      await reset.first().click();
      await page.locator("#bs-current").waitFor();
    } finally {
      await tripping.stop();
    }
  });
});

/** North with its trip level a little above the room, so that it trips within seconds of light. */
function benchThatTrips(): string {
  const north = readFileSync(assetFile("daemon/bench-file/benches/north.yaml"), "utf8");
  const low = north.replace("warn: 42 °C", "warn: 23 °C").replace("trip: 50 °C", "trip: 24 °C");
  const file = join(mkdtempSync(join(tmpdir(), "beamsitter-bench-")), "north.yaml");
  writeFileSync(file, low);
  return file;
}
