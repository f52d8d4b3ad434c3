// The bow's own light on the page: its colours by the height of the Sun, the curve across it, and how to turn a filter.
import assert from "node:assert/strict";
import { after, test } from "node:test";
import { arcLean, projection, onCircle } from "../../static/sky.js";
import { baseUrl, closeAll, openPage, outlookOf, scrubTo, waitForOutlook } from "./browser.mjs";
import { alter, checkDrawing, checkSound, withoutRequests } from "./checks.mjs";

const EQUATOR = "?lat=5&lon=-4.1";
const ARTIFACTS = new URL("artifacts/", import.meta.url).pathname;
const strong = (o) => o.steps.forEach((s) => Object.assign(s, { chance: 0.8, prominence: 0.7 }));
const stepNear = ({ steps }, sun_deg) => steps.reduce((best, s, i) => (Math.abs(s.sun.elevation_deg - sun_deg) < Math.abs(steps[best].sun.elevation_deg - sun_deg) ? i : best), 0);
const computed = (page) => page.waitForFunction(() => document.getElementById("sky").dataset.light === "computed");

/** Opens the page with a strong bow at every step, scrubbed to a height of the Sun, its light there. */
async function openAt(sun_deg, options = {}) {
  const opened = await openPage({ path: EQUATOR, prepare: (p) => alter(p, "outlook", strong), ...options });
  await waitForOutlook(opened.page);
  const outlook = await outlookOf(opened.page);
  const i = stepNear(outlook, sun_deg);
  await scrubTo(opened.page, i);
  await computed(opened.page);
  return { ...opened, outlook, step: outlook.steps[i] };
}

/** Colours of the drawing along the arc's radius at 20° from its top, by angle from the antisolar point. */
async function coloursAcross(page, axis, angles) {
  const data = (await page.locator("#sky").screenshot({ scale: "device" })).toString("base64");
  const camera = projection(await page.evaluate(() => Object.fromEntries(["azimuth_deg", "scale", "x0", "y0"].map((k) => [k, Number(document.getElementById("sky").dataset[k])]))));
  return page.evaluate(async ({ data, points }) => {
    const bytes = Uint8Array.from(atob(data), (c) => c.charCodeAt(0));
    const image = await createImageBitmap(new Blob([bytes], { type: "image/png" }));
    const canvas = new OffscreenCanvas(image.width, image.height).getContext("2d");
    canvas.drawImage(image, 0, 0);
    const k = image.width / document.getElementById("sky").getBoundingClientRect().width;
    return points.map(({ x, y }) => [...canvas.getImageData(Math.round(x * k), Math.round(y * k), 1, 1).data]);
  }, { data, points: angles.map((a) => camera.project(onCircle(axis, a, 20))) });
}

after(closeAll);

test("a few answers serve every height of the Sun, asked for once", async () => {
  const asked = [];
  const { page, context, errors } = await openPage({ path: EQUATOR, prepare: (p) => p.on("request", (r) => r.url().includes("/v1/light") && asked.push(r.url())) });
  await waitForOutlook(page);
  const outlook = await outlookOf(page);
  for (const sun of [1, 5, 12, 30, 50]) {
    await scrubTo(page, stepNear(outlook, sun));
    await computed(page);
    await checkDrawing(page, `Sun ${sun}`);
  }
  assert.ok(asked.length >= 4 && asked.length <= 6, `${asked.length} requests`);
  assert.equal(new Set(asked).size, asked.length);
  assert.ok(asked.every((url) => new URL(url).searchParams.get("rain_mm_h") === "5"));
  await checkSound(page, errors, "with its light");
  await context.close();
});

test("the drawn bow is brightest where the answer has it, red outside, red alone under a low Sun", async () => {
  const angles = Array.from({ length: 121 }, (_, i) => 39 + i * 0.05);
  const profile = async (sun_deg) => {
    const { page, context, step } = await openAt(sun_deg, { deviceScaleFactor: 4 });
    const colours = await coloursAcross(page, step.antisolar_point, angles);
    const asked = new URL(`v1/light?rain_mm_h=5&sun_elevation_deg=${step.sun.elevation_deg}`, await baseUrl());
    const told = await (await fetch(asked)).json();
    await context.close();
    return { colours, told, peak: (value) => angles[colours.reduce((best, c, j) => (value(c) > value(colours[best]) ? j : best), 0)] };
  };
  const high = await profile(18);
  const brightest = high.peak(([r, g, b]) => 0.2126 * (r / 255) ** 2.2 + 0.7152 * (g / 255) ** 2.2 + 0.0722 * (b / 255) ** 2.2);
  assert.ok(Math.abs(brightest - high.told.bows[0].brightest_deg) < 0.35, `${brightest}, not ${high.told.bows[0].brightest_deg}`);
  const [red, blue] = [high.peak(([r, , b]) => r - b), high.peak(([r, , b]) => b - r)];
  assert.ok(red > brightest - 0.05 && blue < brightest - 0.2, `red ${red}, blue ${blue}`);
  const low = await profile(1);
  const gain = ({ colours }, part) => Math.max(...colours.map((c) => c[part])) - colours.at(-1)[part];
  const [reddish, plain] = [low, high].map((seen) => gain(seen, 0) / gain(seen, 2));
  assert.ok(gain(low, 0) > 25 && reddish > 2 && reddish > 1.5 * plain, `red over blue ${reddish} under a low Sun, ${plain} under a high one`);
  assert.ok(gain(high, 2) > 15, `blue ${gain(high, 2)} under a high Sun`);
});

test("the bow is drawn as strong as the hour's contrast", async () => {
  const drawn = async (prominence) => {
    const { page, context, step } = await openAt(18, { deviceScaleFactor: 3, prepare: (p) => alter(p, "outlook", (o) => o.steps.forEach((s) => Object.assign(s, { chance: prominence === null ? null : 0.5, prominence }))) });
    const colours = await coloursAcross(page, step.antisolar_point, Array.from({ length: 61 }, (_, i) => 40 + i * 0.05));
    await context.close();
    const green = colours.map((c) => c[1]);
    return Math.max(...green) - green.at(-1);
  };
  const [none, weak, bright, unknown] = [await drawn(0), await drawn(0.25), await drawn(0.6), await drawn(null)];
  assert.ok(none > 0 && none < weak && weak < bright, `${none}, ${weak}, ${bright}`);
  assert.ok(unknown > weak, `${unknown}: where the weather is unknown, the bow of plain rain`);
});

test("without an answer on light the colours by eye stay, and the panel says so", async () => {
  let down = true;
  const { page, context, errors } = await openPage({ path: EQUATOR, prepare: (p) => p.route("**/v1/light*", (r) => (down ? r.abort("connectionrefused") : r.continue())) });
  await waitForOutlook(page);
  await scrubTo(page, stepNear(await outlookOf(page), 18));
  assert.equal(await page.$eval("#sky", (n) => n.dataset.light), "by-eye");
  assert.ok(await page.$eval("#sky .band", (n) => Number(n.parentElement.getAttribute("opacity")) > 0));
  await page.click("#across summary");
  await page.waitForFunction(() => /has not come/.test(document.getElementById("across-say").textContent));
  assert.equal(await page.isVisible("#curve"), false);
  await checkSound(page, withoutRequests(errors), "no light");
  down = false;
  await page.evaluate(() => window.dispatchEvent(new Event("online")));
  await computed(page);
  assert.equal(await page.isVisible("#curve"), true);
  await context.close();
});

for (const [name, options] of Object.entries({ phone: {}, dark: { scheme: "dark" }, desk: { viewport: { width: 1280, height: 800 } }, large: { largeText: true } })) {
  test(`the curve across the bow: ${name}`, async () => {
    const { page, context, errors, step } = await openAt(18, options);
    await page.click("#across summary");
    await page.waitForSelector("#curve .curve-line[d]");
    const said = await page.textContent("#across");
    for (const part of [/ray 41\.8°, brightest 4[012]\.\d°/, /ray 51\.4°, brightest 5[123]\.\d°/, /contrast 0\.\d/, /bright, in all its colours/, /5 mm\/h/, /axis level, gone with the axis upright/]) assert.match(said, part);
    assert.doesNotMatch(said, /undefined|null|NaN/);
    // On a level horizon an arc leans at its left foot by asin(sin h/sin ρ) from the upright (spherical trigonometry).
    const rad = Math.PI / 180;
    const lean = Math.round(90 - Math.asin(Math.sin(step.sun.elevation_deg * rad) / Math.sin(42.39 * rad)) / rad);
    const told = Number(/Left foot: strongest with the axis (\d+)° from level, its top to the right/.exec(said)[1]);
    assert.ok(Math.abs(told - lean) <= 1, `${told}, not ${lean}`);
    const texts = await page.$$eval("#curve text", (nodes) => nodes.map((n) => { const b = n.getBoundingClientRect(); return { text: n.textContent, left: b.left, right: b.right, top: b.top + b.height * 0.2, bottom: b.bottom - b.height * 0.2 }; }));
    const frame = await page.$eval("#curve", (n) => { const b = n.getBoundingClientRect(); return { left: b.left, right: b.right }; });
    texts.forEach((a, i) => {
      assert.ok(a.left >= frame.left - 1 && a.right <= frame.right + 1, `${a.text} leaves the curve`);
      for (const b of texts.slice(i + 1)) assert.ok(!(a.left < b.right && b.left < a.right && a.top < b.bottom && b.top < a.bottom), `${a.text} over ${b.text}`);
    });
    await page.locator("#curve").scrollIntoViewIfNeeded();
    await page.screenshot({ path: `${ARTIFACTS}curve-${name}.png` });
    await checkSound(page, errors, `curve, ${name}`);
    // It follows the hour: another Sun, another lean; no Sun, no curve.
    const before = await page.$eval("#curve .curve-line", (n) => n.getAttribute("d"));
    const outlook = await outlookOf(page);
    await scrubTo(page, stepNear(outlook, 2));
    assert.notEqual(await page.$eval("#curve .curve-line", (n) => n.getAttribute("d")), before);
    await scrubTo(page, stepNear(outlook, -20));
    assert.match(await page.textContent("#across-say"), /Sun is down/);
    assert.equal(await page.isVisible("#curve"), false);
    await context.close();
  });
}

test("an arc is level at its crown and leans alike at both feet", () => {
  const axis = { azimuth_deg: 70, elevation_deg: -25 };
  assert.ok(Math.abs(Math.sin(arcLean(axis, onCircle(axis, 42, 0)) * Math.PI / 180)) < 1e-9);
  const [left, right] = [-70, 70].map((position) => arcLean(axis, onCircle(axis, 42, position)));
  assert.ok(left < 90 && Math.abs(left + right - 180) < 1e-9, `${left} ${right}`);
});
