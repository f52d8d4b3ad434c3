// The page as a user meets it, in real Chromium, on a phone and at a desk, by day and by night.
import assert from "node:assert/strict";
import { mkdir } from "node:fs/promises";
import { after, before, test } from "node:test";
import { projection, separation, onCircle } from "../../static/sky.js";
import { alter, checkDrawing, checkSound, withoutRequests } from "./checks.mjs";
import { baseUrl, closeAll, nextFrame, openPage, outlookOf, scrubTo, waitForOutlook } from "./browser.mjs";

/** On the equator every day has a low, a high and a sunken Sun, whatever the date. */
const EQUATOR = "?lat=5&lon=-4.1";
const PHONE = { width: 360, height: 740 };
const DESK = { width: 1280, height: 800 };
const ARTIFACTS = new URL("artifacts/", import.meta.url).pathname;
const shot = (page, name) => page.screenshot({ path: `${ARTIFACTS}${name}.png` });
const text = (page, id) => page.textContent(`#${id}`);
const cameraOf = (page) => page.evaluate(() => Object.fromEntries(Object.entries(document.getElementById("sky").dataset).map(([k, v]) => [k, Number(v)])));

/** Steps of an outlook at telling heights of the Sun. */
function tellingSteps({ steps }) {
  const at = (test) => steps.findIndex(({ sun: { elevation_deg: h } }) => test(h));
  return { low: at((h) => h > 1 && h < 4), middle: at((h) => h > 18 && h < 22), steep: at((h) => h > 37 && h < 40), high: at((h) => h > 55), night: at((h) => h < -8) };
}

before(() => mkdir(ARTIFACTS, { recursive: true }));
after(closeAll);

for (const [size, viewport] of Object.entries({ phone: PHONE, desk: DESK })) {
  for (const scheme of ["light", "dark"]) {
    test(`${size}, ${scheme}: first visit, a site, every height of the Sun`, async () => {
      const { page, context, errors } = await openPage({ viewport, scheme });
      await waitForOutlook(page);
      assert.match(await text(page, "say"), /\S/);
      await checkSound(page, errors, "first visit");
      await page.goto(new URL(EQUATOR, await baseUrl()).href);
      await waitForOutlook(page);
      for (const [name, i] of Object.entries(tellingSteps(await outlookOf(page)))) {
        assert.ok(i >= 0, `no step with a ${name} Sun`);
        await scrubTo(page, i);
        await shot(page, `${size}-${scheme}-${name}`);
        await checkDrawing(page, name);
        await checkSound(page, errors, name);
      }
      await page.click("summary");
      assert.ok((await page.locator("#hours li").count()) >= 4);
      await checkSound(page, errors, "hour by hour");
      await page.click("#key-place");
      await shot(page, `${size}-${scheme}-place`);
      await checkSound(page, errors, "place sheet");
      await context.close();
    });
  }
}

test("crown and feet stand where the service says, at several Suns and over a skyline", async () => {
  const { page, context } = await openPage();
  const base = await baseUrl();
  const { sites } = await (await fetch(new URL("v1/sites", base))).json();
  const hilly = sites.find((s) => s.skyline?.length);
  let compared = 0;
  for (const query of [EQUATOR, "?lat=5&lon=-4.1&eye_height_m=900", ...(hilly ? [`?site=${hilly.name}`] : [])]) {
    await page.goto(new URL(query, base).href);
    await waitForOutlook(page);
    const outlook = await outlookOf(page);
    for (const [name, i] of Object.entries(tellingSteps(outlook))) {
      if (i < 0) continue;
      await scrubTo(page, i);
      const bow = await (await fetch(new URL(`v1/bow${query}&time=${outlook.steps[i].time}`, base))).json();
      const { crown, feet, above_horizon } = bow.bows[0];
      const drawn = await page.evaluate(() => {
        const frame = document.getElementById("sky").getBoundingClientRect();
        return Object.fromEntries([...document.querySelectorAll("[data-mark]")].map((n) => {
          const b = n.getBoundingClientRect();
          return [n.dataset.mark, { x: b.left + b.width / 2 - frame.left, y: b.top + b.height / 2 - frame.top }];
        }));
      });
      const camera = projection(await cameraOf(page));
      const expectAt = (mark, direction) => {
        const apart = separation(camera.unproject(drawn[mark]), direction);
        assert.ok(apart < 0.3, `${query} ${name}: ${mark} is drawn ${apart.toFixed(2)}° off`);
        compared += 1;
      };
      const sun_up = bow.sun.elevation_deg > 0;
      assert.equal(Boolean(drawn.crown), sun_up && above_horizon, `${query} ${name}: crown`);
      if (drawn.crown) expectAt("crown", crown);
      assert.equal(Boolean(drawn["left-foot"]), sun_up && feet !== null, `${query} ${name}: feet`);
      if (drawn.antisolar) expectAt("antisolar", bow.antisolar_point);
      if (!drawn["left-foot"]) continue;
      for (const side of ["left", "right"]) {
        const azimuth_deg = feet[`${side}_azimuth_deg`];
        const foot = camera.unproject(drawn[`${side}-foot`]);
        const off = separation(foot, { azimuth_deg, elevation_deg: foot.elevation_deg });
        assert.ok(off < 0.3, `${query} ${name}: ${side} foot is drawn ${off.toFixed(2)}° off`);
        compared += 1;
      }
    }
  }
  assert.ok(compared >= 15, `only ${compared} marks compared`);
  await context.close();
});

test("without computed light the colours on the screen lie at the bow's radii, red outside", async () => {
  const { page, context } = await openPage({ path: EQUATOR, deviceScaleFactor: 4, prepare: async (p) => {
    await p.route("**/v1/light*", (r) => r.abort());
    await alter(p, "outlook", (o) => o.steps.forEach((s) => (s.chance = 1)));
  } });
  await waitForOutlook(page);
  const outlook = await outlookOf(page);
  const i = tellingSteps(outlook).middle;
  await scrubTo(page, i);
  const camera = projection(await cameraOf(page));
  const axis = outlook.steps[i].antisolar_point;
  const { red, green, violet } = outlook.radius_deg.primary;
  const angles = [];
  for (let a = violet - 2; a <= red + 2; a += 0.05) angles.push(a);
  const png = await page.locator("#sky").screenshot({ scale: "device" });
  const colours = await page.evaluate(async ({ data, points }) => {
    const bytes = Uint8Array.from(atob(data), (c) => c.charCodeAt(0));
    const image = await createImageBitmap(new Blob([bytes], { type: "image/png" }));
    const canvas = new OffscreenCanvas(image.width, image.height).getContext("2d");
    canvas.drawImage(image, 0, 0);
    const k = image.width / document.getElementById("sky").getBoundingClientRect().width;
    return points.map(({ x, y }) => [...canvas.getImageData(Math.round(x * k), Math.round(y * k), 1, 1).data]);
  }, { data: png.toString("base64"), points: angles.map((a) => camera.project(onCircle(axis, a, 20))) });
  const peak = (value) => angles[colours.reduce((best, c, j) => (value(c) > value(colours[best]) ? j : best), 0)];
  const reddest = peak(([r, , b]) => r - b);
  const bluest = peak(([r, , b]) => b - r);
  assert.ok(reddest > green - 0.3 && reddest < red + 0.3, `red at ${reddest}`);
  assert.ok(bluest > violet - 0.3 && bluest < green, `blue at ${bluest}`);
  const edge = angles.filter((_, j) => colours[j][0] - colours[j][2] > 40).at(-1);
  assert.ok(Math.abs(edge - red) < 0.3, `red ends at ${edge}, not ${red}`);
  await context.close();
});

test("the device's position, allowed", async () => {
  const { page, context, errors } = await openPage({ geolocation: { latitude: 47.123456, longitude: 8.654321 }, permissions: ["geolocation"] });
  await waitForOutlook(page);
  const asked = page.waitForRequest((r) => r.url().includes("/v1/outlook"));
  await page.click("#key-place");
  await page.click("#locate");
  const query = new URL((await asked).url()).searchParams;
  assert.deepEqual([query.get("lat"), query.get("lon")], ["47.123", "8.654"], "no finer position leaves the device");
  await page.waitForSelector("#place:not([open])", { state: "attached" });
  assert.equal(await text(page, "place-name"), "47.123, 8.654");
  await page.reload();
  await waitForOutlook(page);
  assert.equal(await text(page, "place-name"), "47.123, 8.654", "kept over a reload");
  await checkSound(page, errors, "position");
  await context.close();
});

test("the device's position, denied: said so, and the page goes on", async () => {
  const { page, context, errors } = await openPage();
  await waitForOutlook(page);
  const name = await text(page, "place-name");
  await page.click("#key-place");
  await page.click("#locate");
  await page.waitForFunction(() => /did not give|gives no position/.test(document.getElementById("place-message").textContent));
  await checkSound(page, errors, "denied");
  await page.click("#place-close");
  assert.equal(await text(page, "place-name"), name);
  await context.close();
});

test("a place typed in; a bad one is refused field by field and nothing is lost", async () => {
  const { page, context, errors } = await openPage();
  await waitForOutlook(page);
  const name = await text(page, "place-name");
  await page.click("#key-place");
  await page.fill("[name=lat]", "97");
  await page.fill("[name=lon]", "east of here");
  await page.click("#place-go");
  await page.waitForFunction(() => document.getElementById("error-lat").textContent && document.getElementById("error-lon").textContent);
  assert.match(await text(page, "error-lat"), /90/);
  assert.equal(await page.getAttribute("[name=lat]", "aria-invalid"), "true");
  assert.equal(await text(page, "place-name"), name);
  await shot(page, "bad-place");
  await checkSound(page, withoutRequests(errors), "bad place");
  await page.fill("[name=lat]", "33,5 S");
  await page.fill("[name=lon]", "18.25");
  await page.keyboard.press("Enter");
  await page.waitForSelector("#place:not([open])", { state: "attached" });
  assert.equal(await text(page, "place-name"), "−33.5, 18.25");
  assert.equal(new URL(page.url()).searchParams.get("lat"), "-33.5");
  await context.close();
});

test("scrubbing by finger and by keyboard moves the needle and asks nothing of the service", async () => {
  const { page, context, errors } = await openPage({ path: EQUATOR, touch: true });
  await waitForOutlook(page);
  const requests = [];
  page.on("request", (r) => requests.push(r.url()));
  const value = () => page.$eval("#scrub", (n) => Number(n.value));
  const start = await value();
  const box = await page.locator("#tape").boundingBox();
  const y = box.y + box.height / 2;
  const cdp = await context.newCDPSession(page);
  const touch = (type, ...points) => cdp.send("Input.dispatchTouchEvent", { type, touchPoints: points.map((x) => ({ x, y })) });
  await touch("touchStart", 300);
  for (let x = 290; x >= 100; x -= 10) await touch("touchMove", x);
  await touch("touchEnd");
  await nextFrame(page);
  const dragged = await value();
  assert.ok(dragged - start > 60, `a drag of 200 px moved ${dragged - start} steps`);
  await page.touchscreen.tap(box.x + box.width - 60, y);
  await nextFrame(page);
  assert.ok((await value()) > dragged, "a tap right of the needle goes on in time");
  await page.focus("#scrub");
  const before_keys = await value();
  await page.keyboard.press("ArrowRight");
  await nextFrame(page);
  assert.equal(await value(), before_keys + 1);
  await page.keyboard.press("PageDown");
  await nextFrame(page);
  assert.equal(await value(), before_keys + 1 - 12);
  assert.match(await page.getAttribute("#scrub", "aria-valuetext"), /\d\d:\d\d, chance/);
  await page.keyboard.press("End");
  await nextFrame(page);
  assert.equal(await page.isDisabled("#key-on"), true);
  await page.keyboard.press("Home");
  await page.click("#key-on");
  await nextFrame(page);
  assert.equal(await value(), 1);
  await page.click("#key-now");
  await nextFrame(page);
  assert.equal(await value(), start);
  assert.deepEqual(requests, []);
  assert.deepEqual(errors, []);
  await context.close();
});

test("windows lead to their best moment, and the line says what to do", async () => {
  const end = (ms) => new Date(ms).toISOString();
  const made = (o) => {
    const i = o.steps.findIndex((s, j) => j > 3 && s.crown?.elevation_deg > 10 && s.sun.elevation_deg > 2);
    const at = Date.parse(o.steps[i].time);
    // At the real service this place may have no weather; a Sun that is up now must not change the line.
    for (const step of o.steps) step.chance ??= 0;
    Object.assign(o.steps[i], { chance: 0.64, limited_by: "sun_blocked" });
    o.windows = [{ start: end(at - 600e3), end: end(at + 600e3), best: { time: o.steps[i].time, chance: 0.64 }, face_azimuth_deg: o.steps[i].antisolar_point.azimuth_deg, face_magnetic_deg: (o.steps[i].antisolar_point.azimuth_deg + 4) % 360, crown_elevation_deg: o.steps[i].crown.elevation_deg, visible_arc_fraction: o.steps[i].visible_arc_fraction }];
  };
  const { page, context, errors } = await openPage({ path: EQUATOR, prepare: (p) => alter(p, "outlook", made) });
  await waitForOutlook(page);
  const { windows } = await outlookOf(page);
  assert.match(await text(page, "say"), /^Next: face \d+°; crown \d+° up; .*\d\d:\d\d to \d\d:\d\d; chance 0\.6$/);
  await page.click("#windows button");
  await nextFrame(page);
  assert.equal(await page.$eval("#scrub", (n) => n.value), String((await outlookOf(page)).steps.findIndex((s) => s.time === windows[0].best.time)));
  assert.match(await text(page, "say"), /^Face \d+°; crown \d+° up; /);
  assert.match(await text(page, "why"), /cloud stands between the Sun and the rain/);
  const [face, magnetic] = [await text(page, "fact-face"), await text(page, "fact-magnetic")].map((t) => parseInt(t, 10));
  assert.ok([4, 3, 5, -356, -355, -357].includes(magnetic - face), `${face} true, ${magnetic} by compass`);
  await page.click("#key-now");
  await page.click("#key-next");
  await nextFrame(page);
  assert.match(await text(page, "say"), /^Face /);
  await checkSound(page, errors, "window");
  await context.close();
});

test("why not: every limiting reason has its own plain words", async () => {
  const reasons = ["sun_down", "sun_too_high", "skyline", "no_rain", "sun_blocked", "snow", "too_faint", "no_data"];
  const low = [];
  const made = (o) => {
    o.windows = [];
    low.splice(0, low.length, ...o.steps.keys());
    o.steps.forEach((s, i) => Object.assign(s, { limited_by: reasons[i % 8], chance: reasons[i % 8] === "no_data" ? null : 0 }));
  };
  const { page, context, errors } = await openPage({ path: EQUATOR, prepare: (p) => alter(p, "outlook", made) });
  await waitForOutlook(page);
  const first = tellingSteps(await outlookOf(page)).middle;
  const said = new Set();
  for (let i = first; i < first + 8; i += 1) {
    await scrubTo(page, i);
    const why = await text(page, "why");
    assert.doesNotMatch(why, /_|undefined|null|NaN/);
    said.add(why);
  }
  assert.equal(said.size, 8, [...said].join("\n"));
  await scrubTo(page, first + ((8 - (first % 8)) % 8));
  assert.match(await text(page, "say"), /No bow in the next 48 hours/);
  assert.deepEqual(errors, []);
  await context.close();
});

test("feed stale, failing, without data: said plainly, the geometry stays", async () => {
  const states = {
    stale: [(o) => Object.assign(o.feed, { stale: true, age_s: 26000 }), "stale", /Old weather \(7 h 13 min\)/, /is old/],
    failing: [() => {}, "failing", /feed is failing/, /is failing.*Last failure .*timed out/],
    no_data: [(o) => { o.windows = []; o.steps.forEach((s) => Object.assign(s, { chance: null, prominence: null, limited_by: s.sun.elevation_deg < 0 ? "sun_down" : "no_data" })); }, "fresh", /No weather for this place/, /./],
    no_feed: [(o) => { o.feed = null; o.windows = []; o.steps.forEach((s) => Object.assign(s, { chance: null, prominence: null, limited_by: "no_data" })); }, "fresh", /No weather for this place/, /No weather feed/],
  };
  for (const [name, [change, state, notice, source]] of Object.entries(states)) {
    const { page, context, errors } = await openPage({ path: EQUATOR, prepare: async (p) => {
      await alter(p, "outlook", (o) => void change(o));
      await alter(p, "feeds", (f) => f.feeds.forEach((feed) => Object.assign(feed, { state, last_failure: state === "failing" ? { time: "2031-05-04T14:00:00Z", reason: "timed out after 10 s" } : null })));
    } });
    await waitForOutlook(page);
    const outlook = await outlookOf(page);
    await scrubTo(page, tellingSteps(outlook).middle);
    assert.match(await text(page, "notice"), notice);
    assert.match(await text(page, "feed"), source);
    assert.equal(await page.locator("[data-mark=crown]").count(), 1);
    if (name.startsWith("no_")) assert.match(await text(page, "say"), /^Face \d+°; crown \d+° up; chance unknown$/);
    await shot(page, `feed-${name}`);
    await checkDrawing(page, name);
    await checkSound(page, errors, name);
    await context.close();
  }
});

test("the server is down at the first visit: a clear message and a retry that works", async () => {
  let down = true;
  const { page, context, errors } = await openPage({ prepare: (p) => p.route("**/v1/**", (r) => (down ? r.abort("connectionrefused") : r.continue())) });
  await page.waitForSelector(".retry");
  assert.match(await text(page, "notice"), /No answer from the server/);
  await shot(page, "server-down");
  await checkSound(page, withoutRequests(errors), "server down");
  down = false;
  await page.click(".retry");
  await waitForOutlook(page);
  assert.equal(await page.locator(".retry").count(), 0);
  await context.close();
});

test("the network goes and comes back: the last answer stays with its age, and scrubs on", async () => {
  const { page, context, errors } = await openPage({ path: EQUATOR, movingClock: true });
  await waitForOutlook(page);
  await context.setOffline(true);
  await page.clock.fastForward(20 * 60e3);
  await page.waitForSelector(".retry");
  assert.match(await text(page, "notice"), /No answer from the server\. Shown: the answer of 2\d min ago/);
  await scrubTo(page, tellingSteps(await outlookOf(page)).low);
  assert.equal(await page.locator("[data-mark=crown]").count(), 1);
  await shot(page, "offline");
  await checkSound(page, withoutRequests(errors), "offline");
  await context.setOffline(false);
  await page.waitForSelector(".retry", { state: "detached" });
  assert.equal(withoutRequests(errors).length, 0);
  await context.close();
});

test("a slow network: the frame is painted before the outlook, and the last answer at once on return", async () => {
  let slow = false;
  const { page, context } = await openPage({ path: EQUATOR, prepare: (p) => p.route("**/v1/outlook*", async (r) => {
    if (slow) await new Promise((done) => setTimeout(done, 1500));
    await r.continue();
  }) });
  await waitForOutlook(page);
  slow = true;
  await page.reload();
  await page.waitForFunction(() => Number(document.getElementById("scrub").max) > 0);
  assert.match(await text(page, "notice"), /Fetching/);
  await waitForOutlook(page);
  await page.goto(new URL("?lat=6&lon=10", await baseUrl()).href);
  await page.waitForSelector("#notice.busy");
  assert.equal(await text(page, "say"), "Reading the sky…");
  assert.ok(await page.$eval("#sky .land", (n) => n.getAttribute("d").length > 20));
  await context.close();
});

test("text of twice the size: nothing cut, nothing over another, no sideways scroll", async () => {
  for (const viewport of [PHONE, DESK]) {
    const { page, context, errors } = await openPage({ path: EQUATOR, viewport, largeText: true });
    await waitForOutlook(page);
    assert.equal(await page.evaluate(() => getComputedStyle(document.documentElement).fontSize), "32px");
    for (const [name, i] of Object.entries(tellingSteps(await outlookOf(page)))) {
      await scrubTo(page, i);
      await shot(page, `large-${viewport.width}-${name}`);
      await checkDrawing(page, `large text, ${name}`);
    }
    await page.click("summary");
    await checkSound(page, errors, "large text");
    await page.click("#key-place");
    await checkSound(page, errors, "large text, place");
    await context.close();
  }
});

test("nothing overlaps at any hour of two days, on a phone", async () => {
  const { page, context } = await openPage({ path: EQUATOR });
  await waitForOutlook(page);
  const { steps } = await outlookOf(page);
  for (let i = 0; i < steps.length; i += 5) {
    await scrubTo(page, i);
    await checkDrawing(page, `Sun at ${steps[i].sun.elevation_deg.toFixed(1)}`);
  }
  await context.close();
});

test("the service's texts stay text", async () => {
  const { page, context, errors } = await openPage({ path: EQUATOR, prepare: (p) => alter(p, "outlook", (o) => { o.cautions = ["<img src=x onerror=alert(1)>"]; o.feed.name = "<b>x</b>"; }) });
  await waitForOutlook(page);
  assert.equal(await page.locator("#cautions img").count(), 0);
  assert.match(await text(page, "feed"), /<b>x<\/b>/);
  assert.deepEqual(errors, []);
  await context.close();
});

test("reduced motion: nothing moves by itself", async () => {
  const { page, context } = await openPage({ path: EQUATOR, reducedMotion: "reduce", prepare: (p) => p.route("**/v1/outlook*", () => {}) });
  await page.waitForSelector("#notice.busy");
  assert.equal(await page.evaluate(() => document.getAnimations().filter((a) => a.playState === "running").length), 0);
  await context.close();
});
