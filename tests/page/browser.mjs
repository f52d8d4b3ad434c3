// Debian's Chromium on the page: against RAINWARD_URL, or the stand-in with a fixed clock.
import { chromium } from "playwright-core";
import { startMock } from "./mock.mjs";

const FLAGS = ["--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking", "--disable-component-update", "--disable-sync"];
/** A showery afternoon in May, at the stand-in only. */
export const MOCK_NOW = Date.parse("2031-05-04T15:02:00Z");

let mock = null;
const browsers = new Map();
export const real = Boolean(process.env.RAINWARD_URL);

export async function baseUrl() {
  if (real) return process.env.RAINWARD_URL;
  mock ??= await startMock({ now: () => MOCK_NOW });
  return mock.url;
}

async function browserWith(flags) {
  const key = flags.join(" ");
  if (!browsers.has(key)) browsers.set(key, await chromium.launch({ executablePath: process.env.CHROMIUM ?? "/usr/bin/chromium", args: [...FLAGS, ...flags] }));
  return browsers.get(key);
}

/**
 * Opens the page in a context of its own. `errors` collects console errors, uncaught exceptions and breaches of the
 * content policy; `prepare(page)` may set routes before the page loads.
 */
export async function openPage({ viewport = { width: 360, height: 740 }, scheme = "light", path = "", largeText = false, geolocation = null, permissions = [], touch = false, reducedMotion = "no-preference", deviceScaleFactor = 1, movingClock = false, prepare = null } = {}) {
  const browser = await browserWith(largeText ? ["--blink-settings=defaultFontSize=32"] : []);
  const context = await browser.newContext({ viewport, colorScheme: scheme, geolocation: geolocation ?? undefined, permissions, hasTouch: touch, reducedMotion, deviceScaleFactor, timezoneId: "Europe/Lisbon", locale: "en-GB" });
  const page = await context.newPage();
  if (movingClock) await page.clock.install({ time: real ? Date.now() : MOCK_NOW });
  else if (!real) await page.clock.setFixedTime(MOCK_NOW);
  const errors = [];
  page.on("console", (m) => m.type() === "error" && errors.push(m.text()));
  page.on("pageerror", (e) => errors.push(String(e)));
  if (prepare) await prepare(page);
  await page.goto(new URL(path, await baseUrl()).href);
  return { page, context, errors };
}

/** Waits until an outlook stands on the page and nothing is being fetched. */
export async function waitForOutlook(page) {
  await page.waitForFunction(() => Number(document.getElementById("scrub").max) > 0 && !document.getElementById("notice").classList.contains("busy"));
}

/** The outlook that the page holds, as it remembers it. */
export const outlookOf = (page) => page.evaluate(() => JSON.parse(localStorage.getItem("rainward.last")).outlook);

/** Brings a step under the needle through the range input, and waits for the frame. */
export async function scrubTo(page, index) {
  await page.evaluate((i) => {
    const input = document.getElementById("scrub");
    input.value = i;
    input.dispatchEvent(new Event("input", { bubbles: true }));
  }, index);
  await nextFrame(page);
}

export const nextFrame = (page) => page.evaluate(() => new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(done))));

export async function closeAll() {
  for (const browser of browsers.values()) await browser.close();
  browsers.clear();
  await mock?.close();
  mock = null;
}
