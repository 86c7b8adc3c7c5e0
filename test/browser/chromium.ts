import { mkdirSync } from "node:fs";
import { type Browser, type BrowserContext, chromium, type Page } from "playwright-core";
import { packageRoot } from "../../daemon/paths.ts";

/** Debian's Chromium; another one is named in the environment. */
const EXECUTABLE = process.env.BEAMSITTER_CHROMIUM ?? "/usr/bin/chromium";
const FLAGS = [
  "--headless",
  "--no-sandbox",
  "--disable-gpu",
  "--disable-quic",
  "--no-first-run",
  "--disable-background-networking",
  "--disable-component-update",
  "--disable-sync",
];

export const launch = (): Promise<Browser> =>
  chromium.launch({ executablePath: EXECUTABLE, args: FLAGS });

export type Look = "day" | "night";

/** A fresh browser profile of that size and look. */
export function profile(
  browser: Browser,
  size: { width: number; height: number },
  look: Look = "day",
): Promise<BrowserContext> {
  return browser.newContext({
    viewport: size,
    colorScheme: look === "night" ? "dark" : "light",
    timezoneId: "Europe/Berlin",
  });
}

/** Where screenshots are kept after the tests; git ignores them. */
export function artefact(name: string): string {
  const folder = `${packageRoot}/test/artefacts`;
  mkdirSync(folder, { recursive: true });
  return `${folder}/${name}.png`;
}

/** Words that the page wrote to its console as errors, and requests that left the machine. */
export function complaintsOf(page: Page): string[] {
  const out: string[] = [];
  page.on("console", (message) => {
    if (message.type() === "error") out.push(message.text());
  });
  page.on("pageerror", (error) => out.push(error.message));
  page.on("request", (request) => {
    const { hostname, protocol } = new URL(request.url());
    if (protocol !== "data:" && hostname !== "127.0.0.1") out.push(`asked ${request.url()}`);
  });
  return out;
}
