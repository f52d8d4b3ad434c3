// A stand-in for the service, for page tests without it: static/ under the same content policy, and answers that are
// true in geometry and plausible in weather. `node mock.mjs [port]` serves it by hand at the real time.

import { createServer } from "node:http";
import { readFile } from "node:fs/promises";
import { fileURLToPath } from "node:url";
import { dirname, extname, join, normalize } from "node:path";
import { lightAnswer } from "./mocklight.mjs";
import { RADII, bow, horizonFor, sunAt } from "./mocksky.mjs";

const STATIC = join(dirname(fileURLToPath(import.meta.url)), "../../static");
const TYPES = { ".html": "text/html; charset=utf-8", ".js": "text/javascript; charset=utf-8", ".css": "text/css; charset=utf-8", ".svg": "image/svg+xml" };
const SITES = [
  { name: "north-quay", label: "North Quay", lat: 60.21, lon: -4.1, ground_m: 12, eye_height_m: 1.7, skyline: [] },
  { name: "gull-shelf", label: "Gull Shelf", lat: 60.18, lon: -4.02, ground_m: 88, eye_height_m: 80, skyline: [] },
  { name: "ewe-hollow", label: "Ewe Hollow", lat: 60.25, lon: -3.9, ground_m: 60, eye_height_m: 1.7,
    skyline: [[0, 3], [30, 6], [55, 14], [72, 9], [90, 17], [108, 11], [130, 5], [170, 2], [220, 3], [260, 1], [300, 2.5], [340, 2]] },
];
const FEEDS = [{ name: "coast-model", state: "fresh", age_s: 1500, last_failure: null }];
const iso = (ms) => `${new Date(ms).toISOString().slice(0, 19)}Z`;
const RANGES = { lat: [-90, 90, "deg"], lon: [-180, 180, "deg"], eye_height_m: [0, 20000, "m"], hours: [1, 240, "h"] };

class Refused extends Error {
  constructor(status, errors) {
    super("refused");
    Object.assign(this, { status, errors });
  }
}

function observerOf(query) {
  const name = query.get("site");
  const errors = [];
  const number = (field, missing) => {
    const text = query.get(field);
    const [min, max, unit] = RANGES[field];
    if (text === null && missing !== undefined) return missing;
    const value = Number(text);
    if (!text?.trim()) errors.push({ field, detail: `${field} is missing` });
    else if (!Number.isFinite(value)) errors.push({ field, detail: `"${text}" is not a number: ${field} must lie between ${min} and ${max} ${unit}` });
    else if (value < min || value > max) errors.push({ field, detail: `${value} is out of range: ${field} must lie between ${min} and ${max} ${unit}` });
    return value;
  };
  const site = SITES.find((s) => s.name === name);
  if (name !== null && !site) errors.push({ field: "site", detail: `no site is called "${name}"` });
  const observer = site ? { ...site } : { lat: number("lat"), lon: number("lon"), eye_height_m: number("eye_height_m", 1.7), skyline: [] };
  const hours = number("hours", 48);
  if (errors.length) throw new Refused(400, errors);
  observer.dip_deg = 0.0321 * Math.sqrt(observer.eye_height_m) * 0.92;
  return { observer, hours };
}

/** Chance and limit of a step: showers every few hours, gaps of cloud toward the Sun, by smooth waves of time. */
function weather(ms, seed) {
  const h = ms / 3600e3 + seed;
  return { rain: Math.sin(h * 1.9) + 0.5 * Math.sin(h * 0.7), gap: 0.55 + 0.45 * Math.sin(h * 0.9 + 1) };
}

function stepAt(ms, observer) {
  const sun = sunAt(ms, observer.lat, observer.lon);
  const antisolar_point = { azimuth_deg: (sun.azimuth_deg + 180) % 360, elevation_deg: -sun.elevation_deg };
  const arc = bow(antisolar_point, RADII.primary.red, observer);
  const { rain, gap } = weather(ms, observer.lat * 7 + observer.lon);
  const lit = Math.max(0, Math.min(1, rain)) * gap;
  let limited_by = null;
  if (sun.elevation_deg < -observer.dip_deg - 0.27) limited_by = "sun_down";
  else if (sun.elevation_deg < horizonFor(observer, sun.azimuth_deg)) limited_by = "skyline";
  else if (!arc.crown) limited_by = sun.elevation_deg > RADII.primary.red ? "sun_too_high" : "skyline";
  const barred = limited_by !== null;
  if (!barred) limited_by = rain <= 0 ? "no_rain" : gap < 0.4 ? "sun_blocked" : lit < 0.15 ? "too_faint" : lit > 0.7 ? null : "sun_blocked";
  const chance = barred || rain <= 0 ? 0 : Math.round(lit * 100) / 100;
  return { time: iso(ms), sun: { azimuth_deg: sun.azimuth_deg, elevation_deg: sun.elevation_deg }, antisolar_point, crown: arc.crown, visible_arc_fraction: arc.visible_arc_fraction, chance, prominence: chance * 0.3, limited_by };
}

function windowsOf(steps) {
  const windows = [];
  let run = [];
  for (const step of [...steps, { chance: 0 }]) {
    if (step.chance >= 0.3) run.push(step);
    else if (run.length) {
      const best = run.reduce((a, b) => (b.chance > a.chance ? b : a));
      windows.push({ start: run[0].time, end: run.at(-1).time, best: { time: best.time, chance: best.chance }, face_azimuth_deg: best.antisolar_point.azimuth_deg,
        face_magnetic_deg: null, crown_elevation_deg: best.crown.elevation_deg, visible_arc_fraction: best.visible_arc_fraction });
      run = [];
    }
  }
  return windows;
}

function outlook(query, now) {
  const { observer, hours } = observerOf(query);
  const first = Math.ceil(now / 300e3) * 300e3 - 300e3;
  const steps = [];
  for (let ms = first; ms <= first + hours * 3600e3; ms += 300e3) steps.push(stepAt(ms, observer));
  const sky_events = [];
  steps.forEach((s, i) => {
    const before = steps[i - 1]?.sun.elevation_deg;
    if (before < 0 !== s.sun.elevation_deg < 0 && i) sky_events.push({ time: s.time, event: before < 0 ? "sunrise" : "sunset" });
  });
  const { lat, lon, eye_height_m, dip_deg, skyline } = observer;
  return {
    observer: { lat, lon, eye_height_m, horizon: { dip_deg, skyline } },
    feed: { name: "coast-model", issued: iso(now - 1500e3), age_s: 1500, stale: false },
    radius_deg: RADII, steps, windows: windowsOf(steps), sky_events,
    assumed: [{ text: "Cloud base is not in the feed: taken from temperature and humidity, 400 m to 900 m." }, { text: "Drops follow the usual spread of sizes for their rain rate." }],
    cautions: [
      "Thunder: go inside, and wait 30 minutes after the last thunder.",
      "Never look at the Sun through a lens or a viewfinder.",
      "Wet rock is slippery and water rises fast: stay back from edges.",
      "Do not look for the bow while you drive.",
      "Drones and private land: local rules decide.",
      "This is no official weather warning and never replaces one.",
    ],
  };
}

function bowAnswer(query, now) {
  const { observer } = observerOf(query);
  const time = query.get("time") ? Date.parse(query.get("time")) : now;
  const sun = sunAt(time, observer.lat, observer.lon);
  const antisolar_point = { azimuth_deg: (sun.azimuth_deg + 180) % 360, elevation_deg: -sun.elevation_deg };
  const bows = ["primary", "secondary"].map((name, i) => {
    const { crown, feet, visible_arc_fraction } = bow(antisolar_point, RADII[name].red, observer);
    const below = crown ? {} : { below_horizon_by_deg: sun.elevation_deg - RADII[name].red - observer.dip_deg };
    const top = crown ?? { azimuth_deg: antisolar_point.azimuth_deg, elevation_deg: RADII[name].red + antisolar_point.elevation_deg };
    return { order: i + 1, name, radius_deg: RADII[name], crown: top, feet, visible_arc_fraction, above_horizon: crown !== null, ...below };
  });
  return { time: iso(time), observer: { lat: observer.lat, lon: observer.lon, eye_height_m: observer.eye_height_m }, sun: { ...sun, above_horizon: sun.elevation_deg > 0 }, antisolar_point, bows };
}

/** Starts the stand-in on a free port of the loopback. `now` gives the time in ms. */
export async function startMock({ port = 0, now = Date.now } = {}) {
  const routes = {
    "/v1/sites": () => ({ sites: SITES }),
    "/v1/feeds": () => ({ feeds: FEEDS }),
    "/v1/bow": (query) => bowAnswer(query, now()),
    "/v1/light": lightAnswer,
    "/v1/outlook": (query) => outlook(query, now()),
  };
  const server = createServer(async (request, response) => {
    const url = new URL(request.url, "http://mock");
    const send = (status, type, body) => {
      response.writeHead(status, { "content-type": type, "content-security-policy": "default-src 'self'; img-src 'self' data:", "x-content-type-options": "nosniff", "cache-control": "no-store" });
      response.end(body);
    };
    const problem = (status, errors) => send(status, "application/problem+json", JSON.stringify({ type: "about:blank", title: "Bad request", status, detail: errors.map((e) => e.detail).join("; "), errors }));
    const route = routes[url.pathname];
    try {
      if (route) return send(200, "application/json", JSON.stringify(route(url.searchParams)));
      const path = normalize(url.pathname === "/" ? "/index.html" : url.pathname);
      return send(200, TYPES[extname(path)] ?? "application/octet-stream", await readFile(join(STATIC, path)));
    } catch (error) {
      if (error instanceof Refused) return problem(error.status, error.errors);
      return error.code === "ENOENT" ? problem(404, []) : problem(500, [{ field: "", detail: String(error) }]);
    }
  });
  await new Promise((ready) => server.listen(port, "127.0.0.1", ready));
  return { url: `http://127.0.0.1:${server.address().port}/`, close: () => new Promise((done) => server.close(done)) };
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  const { url } = await startMock({ port: Number(process.argv[2] ?? 0) });
  console.log(url);
}
