// Wiring: what the page knows, where it comes from, and when what is drawn anew.

import { fetchFeeds, fetchOutlook, fetchSites } from "./api.js";
import { Curve } from "./curve.js";
import { byId, el, setText } from "./dom.js";
import { bearing, coordinate, hhmm, hhmmUtc, span } from "./format.js";
import { askLight } from "./light.js";
import { day, makeFacts, showHours, showSay, showSources, showStep, showWindows, windowFor } from "./panel.js";
import { PlaceSheet } from "./place.js";
import { turn } from "./sky.js";
import { lastAnswer, lastPlace, rememberAnswer, rememberPlace } from "./store.js";
import { Timeline } from "./timeline.js";
import { SkyView } from "./view.js";
import * as words from "./words.js";

const REFRESH_MS = 5 * 60e3;
const RETRY_MS = 30e3;
const TICK_MS = 15e3;

/** `at` is the time looked at in ms, or null while the page follows the clock. */
const state = { place: null, sites: [], answer: null, failure: null, loading: null, tried: 0, at: null };
let index = 0;
let frame = null;

for (const node of document.querySelectorAll("[data-word]")) node.textContent = words.still[node.dataset.word];
for (const node of document.querySelectorAll("[data-label]")) node.setAttribute("aria-label", words.still[node.dataset.label]);
makeFacts();

const view = new SkyView(byId("sky"));
const timeline = new Timeline(byId("tape"), byId("tape-drawing"), byId("scrub"), (i) => lookAt(timeline.times[i]));
const curve = new Curve();
const sheet = new PlaceSheet((place) => load(place));

function lookAt(ms) {
  state.at = ms;
  frame ??= requestAnimationFrame(draw);
}

/** Draws the step looked at; at most once a frame, and without asking the service anything. */
function draw() {
  frame = null;
  const { answer } = state;
  if (!answer) return;
  const now = Date.now();
  const { outlook } = answer;
  index = timeline.nearest(state.at ?? now);
  const step = outlook.steps[index];
  const ms = timeline.times[index];
  const when = `${day(ms, now)} ${hhmm(ms)}`;
  const feet = view.draw(step, outlook, when);
  showStep(outlook, step, feet, answer.magnetic_offset_deg, now);
  curve.show(step, feet.directions);
  timeline.show(index, words.tape.value(when, step, bearing(step.antisolar_point.azimuth_deg)));
  setText(byId("clock-local"), when);
  const gap = ms - now;
  const relative = state.at === null || Math.abs(gap) < 60e3 ? words.time.now : gap > 0 ? words.time.ahead(gap) : words.time.ago(gap);
  setText(byId("clock-more"), `${relative}, ${words.time.utc(hhmmUtc(ms))}`);
  byId("key-now").setAttribute("aria-pressed", String(state.at === null));
  byId("key-back").disabled = index === 0;
  byId("key-on").disabled = index === outlook.steps.length - 1;
  byId("key-next").disabled = !windowFor(outlook.windows, ms).next;
}

/** Takes an answer onto the page. */
function accept(answer) {
  const { outlook } = answer;
  const turned = outlook.windows.find((w) => w.face_magnetic_deg !== null && w.face_magnetic_deg !== undefined);
  answer.magnetic_offset_deg = turned ? turn(turned.face_azimuth_deg, turned.face_magnetic_deg) : null;
  state.answer = answer;
  const now = Date.now();
  timeline.load({ steps: outlook.steps, windows: outlook.windows, times: outlook.steps.map((s) => Date.parse(s.time)), now });
  byId("reading").hidden = false;
  showWindows(outlook, now, chooseMoment);
  showHours(outlook, now);
  tellNotice();
  draw();
  askLight(outlook.steps.map((s) => s.sun.elevation_deg)).then(
    draw,
    (error) => console.info("colours by eye, no light came:", error.kind ?? error.name),
  );
}

function chooseMoment(ms) {
  lookAt(ms);
  const calm = matchMedia("(prefers-reduced-motion: reduce)").matches;
  window.scrollTo({ top: 0, behavior: calm ? "auto" : "smooth" });
  byId("scrub").focus({ preventScroll: true });
}

function placeName({ site, lat, lon }) {
  if (site) return state.sites.find((s) => s.name === site)?.label ?? site;
  return words.place.position(coordinate(Number(lat)), coordinate(Number(lon)));
}

function takeSites(sites) {
  state.sites = sites;
  if (state.place) setText(byId("place-name"), placeName(state.place));
}

/** Takes a place for good: name, address bar, memory. */
function settle(place) {
  state.place = place;
  setText(byId("place-name"), placeName(place));
  rememberPlace(place);
  history.replaceState(null, "", `?${new URLSearchParams(place)}`);
}

/**
 * Asks for the outlook of a place. The place shown changes only when its answer is there; until then, and when it
 * does not come, the last answer stays.
 */
async function load(place) {
  state.loading?.abort();
  const control = new AbortController();
  state.loading = control;
  state.tried = Date.now();
  tellNotice();
  let outlook, feeds;
  try {
    [outlook, feeds] = await Promise.all([
      fetchOutlook(place, control.signal),
      fetchFeeds(control.signal).then((answer) => answer.feeds),
      ...(state.sites.length ? [] : [fetchSites(control.signal).then((answer) => takeSites(answer.sites))]),
    ]);
  } catch (error) {
    if (state.loading === control) {
      state.loading = null;
      if (place === state.place) state.failure = error;
      tellNotice();
    }
    throw error;
  }
  state.loading = null;
  state.failure = null;
  settle(place);
  const answer = { place, outlook, feeds, received: Date.now() };
  rememberAnswer(answer);
  accept(answer);
}

/** Loads again what is shown; the notice tells how it went. */
function refresh() {
  const place = state.place;
  if (place && !state.loading) load(place).catch((error) => console.info("outlook not renewed:", error.kind ?? error.name));
  else if (!place) begin();
}

/** What stands in the way of a good answer, most important first. */
function tellNotice() {
  const { answer, failure, loading } = state;
  const now = Date.now();
  const parts = [];
  if (loading) parts.push(words.notice.loading);
  else if (failure) parts.push(failure.kind === "problem" ? words.notice.problem(failure.detail) : words.notice[failure.kind]);
  if (answer) {
    showSources(answer.outlook, answer.feeds, answer.received, now);
    if (failure) parts.push(words.notice.kept(span(now - answer.received)));
    const { feed, steps } = answer.outlook;
    const state_of = answer.feeds?.find((f) => f.name === feed?.name)?.state;
    if (steps.every((s) => s.chance === null || s.limited_by === "no_data" || s.sun.elevation_deg < 0)) parts.push(words.notice.no_data);
    else if (feed?.stale) parts.push(words.notice.stale(feed.age_s === null ? null : span(feed.age_s * 1000 + (now - answer.received))));
    else if (state_of === "failing") parts.push(words.notice.failing);
  } else {
    showSay(loading ? words.say.waiting : words.say.nothing);
  }
  const node = byId("notice");
  node.classList.toggle("busy", Boolean(loading));
  node.classList.toggle("bad", Boolean(failure) && !loading);
  const text = parts.join(" ");
  if (node.dataset.told === text) return;
  node.dataset.told = text;
  node.replaceChildren(...(text ? [el("span", {}, text)] : []));
  if (failure && !loading) {
    const key = el("button", { type: "button", class: "retry" }, words.notice.retry);
    key.addEventListener("click", refresh);
    node.append(key);
  }
}

/** The place of the address bar, else the last one, else the first site; none of them: ask. */
async function begin() {
  const query = Object.fromEntries(new URLSearchParams(location.search));
  const asked = query.site ? { site: query.site } : query.lat && query.lon ? query : lastPlace();
  if (asked) {
    settle(asked);
    const kept = lastAnswer(asked, Date.now());
    if (kept) accept(kept);
    refresh();
    return;
  }
  const control = new AbortController();
  state.loading = control;
  state.tried = Date.now();
  tellNotice();
  try {
    takeSites((await fetchSites(control.signal)).sites);
    state.loading = null;
    state.failure = null;
    tellNotice();
    if (state.sites.length) {
      settle({ site: state.sites[0].name });
      refresh();
    } else {
      sheet.open([], null);
    }
  } catch (error) {
    state.loading = null;
    state.failure = error;
    tellNotice();
  }
}

/** Keeps the page true to the clock, and asks again when the answer has aged or has not come. */
function tick() {
  if (document.hidden || state.loading) return;
  tellNotice();
  if (state.at === null) draw();
  if (Date.now() - state.tried > (state.failure ? RETRY_MS : REFRESH_MS)) refresh();
}

const stepBy = (n) => timeline.move(index + n);
byId("key-back").addEventListener("click", () => stepBy(-1));
byId("key-on").addEventListener("click", () => stepBy(1));
byId("key-now").addEventListener("click", () => lookAt(null));
byId("key-next").addEventListener("click", () => {
  const next = windowFor(state.answer.outlook.windows, timeline.times[index]).next;
  if (next) lookAt(Date.parse(next.best.time));
});
byId("key-place").addEventListener("click", () => sheet.open(state.sites, state.place));
window.addEventListener("online", refresh);
document.addEventListener("visibilitychange", tick);
setInterval(tick, TICK_MS);

new ResizeObserver(() => {
  view.measure();
  timeline.paint();
  if (state.answer) draw();
  else view.drawEmpty();
}).observe(byId("sky"));

new ResizeObserver(([dock]) => {
  document.documentElement.style.setProperty("--dock-height", `${dock.target.offsetHeight}px`);
}).observe(document.querySelector(".dock"));

for (const id of ["key-back", "key-on", "key-next"]) byId(id).disabled = true;
setText(byId("place-name"), words.place.none);
view.measure();
view.drawEmpty();
begin();
