// Everything that is read rather than seen: the one line, the reason, the figures, the lists.

import { byId, el, setText, svg } from "./dom.js";
import { daysAhead, hhmm, hhmmUtc, longDay, percent, span } from "./format.js";
import { belowHorizon } from "./sky.js";
import * as words from "./words.js";

const NUMBER_FACTS = ["face", "magnetic", "crown", "feet", "second", "arc", "sun", "chance", "prominence"];

/** "today", "tomorrow" or the day's name. */
export const day = (ms, now) => words.dayWords(daysAhead(ms, now), longDay(ms));

export function windowRange({ start, end }, now) {
  const [a, b] = [Date.parse(start), Date.parse(end)];
  return words.time.range(daysAhead(a, now) === 0 ? null : day(a, now), hhmm(a), hhmm(b));
}

/** The window that holds a time, else the next one after it. */
export function windowFor(windows, ms) {
  const current = windows.find((w) => Date.parse(w.start) <= ms && ms <= Date.parse(w.end));
  return { current, next: windows.find((w) => Date.parse(w.start) > ms) };
}

function sayParts(outlook, step, ms, now) {
  const { steps, windows } = outlook;
  const { current, next } = windowFor(windows, ms);
  if (current) return words.say.window(current, windowRange(current, now), false);
  if (step.chance === null && step.crown && step.sun.elevation_deg > 0) return words.say.geometry(step);
  if (next) return words.say.window(next, windowRange(next, now), true);
  const hours = Math.round((Date.parse(steps.at(-1).time) - Date.parse(steps[0].time)) / 3600e3);
  if (steps.every((s) => s.chance === null || s.sun.elevation_deg < 0) && steps.some((s) => s.chance === null)) return words.say.unknown;
  if (windows.length) return words.say.past(hours);
  const best = steps.reduce((a, b) => ((b.chance ?? 0) > (a.chance ?? 0) ? b : a));
  const when = Date.parse(best.time);
  return words.say.none(hours, best.chance > 0 ? words.bestChance(best.chance, `${day(when, now)} ${hhmm(when)}`) : null);
}

export function showSay([before, strong = "", after = ""]) {
  const node = byId("say");
  if (node.textContent !== before + strong + after) node.replaceChildren(before, el("b", {}, strong), after);
}

export function makeFacts() {
  const list = byId("facts");
  list.hidden = true;
  for (const name of NUMBER_FACTS) list.append(el("div", {}, el("dt", {}, words.facts[name][0]), el("dd", { id: `fact-${name}` })));
}

/** Texts of one step; called for every step that passes under the needle. */
export function showStep(outlook, step, feet, magnetic_offset_deg, now) {
  byId("facts").hidden = false;
  const ms = Date.parse(step.time);
  showSay(sayParts(outlook, step, ms, now));
  setText(byId("why"), words.why(step, belowHorizon(step, outlook)));
  const { azimuth_deg, elevation_deg } = step.antisolar_point;
  const sun_up = step.sun.elevation_deg > 0;
  const magnetic = !sun_up || magnetic_offset_deg === null ? null : (azimuth_deg + magnetic_offset_deg + 360) % 360;
  const values = {
    face: [sun_up ? azimuth_deg : null],
    magnetic: [magnetic],
    crown: [sun_up ? (step.crown?.elevation_deg ?? null) : null],
    feet: [feet.left, feet.right],
    second: [sun_up ? elevation_deg + outlook.radius_deg.secondary.red : -1],
    arc: [percent(sun_up ? step.visible_arc_fraction : 0)],
    sun: [step.sun.azimuth_deg, step.sun.elevation_deg],
    chance: [step.chance],
    prominence: [step.prominence],
  };
  byId("fact-magnetic").parentElement.hidden = magnetic === null;
  for (const [name, given] of Object.entries(values)) setText(byId(`fact-${name}`), words.facts[name][1](...given));
}

/** A small true arc over a horizon: radius and crown to scale, 1.2 px to the degree. */
function glyph(crown_deg, radius_deg) {
  const [w, h, px] = [108, 60, 1.2];
  const ground = h - 5;
  const circle = (extra, kind) => {
    const r = (radius_deg + extra) * px;
    return svg("circle", { cx: w / 2, cy: ground - crown_deg * px + radius_deg * px, r, class: kind });
  };
  return svg(
    "svg",
    { viewBox: `0 0 ${w} ${h}`, class: "glyph", "aria-hidden": "true", focusable: "false" },
    svg("rect", { width: w, height: h, class: "glyph-sky" }),
    circle(0, "glyph-red"), circle(-1.2, "glyph-yellow"), circle(-2.4, "glyph-blue"),
    svg("rect", { y: ground, width: w, height: 5, class: "glyph-land" }),
  );
}

/** The windows as large keys; a press brings the best moment under the needle. */
export function showWindows(outlook, now, onChoose) {
  const list = byId("windows");
  const known = outlook.steps.some((s) => s.chance !== null && s.sun.elevation_deg > 0);
  if (outlook.windows.length === 0) {
    list.replaceChildren(el("li", { class: "note" }, known ? words.windows.none : words.windows.unknown));
    return;
  }
  list.replaceChildren(
    ...outlook.windows.map((w) => {
      const [start, end, best] = [w.start, w.end, w.best.time].map(Date.parse);
      const key = el(
        "button",
        { type: "button", class: "window" },
        el("span", { class: "window-when" }, el("b", {}, `${hhmm(start)} – ${hhmm(end)}`), ` ${day(start, now)}`),
        glyph(w.crown_elevation_deg, outlook.radius_deg.primary.red),
        el("span", { class: "window-how" }, el("b", {}, words.windows.face(w)), `, ${words.windows.crown(w.crown_elevation_deg)}`),
        el("span", { class: "window-chance" }, el("b", {}, words.windows.chance(w.best.chance)), `, ${words.windows.best(hhmm(best))}`),
        el("span", { class: "window-utc" }, words.time.utc(`${hhmmUtc(start)} – ${hhmmUtc(end)}`)),
      );
      key.addEventListener("click", () => onChoose(best));
      return el("li", {}, key);
    }),
  );
}

/** Runs of steps with the same reason: the tape in words. */
export function showHours(outlook, now) {
  const runs = [];
  for (const step of outlook.steps) {
    const by = step.limited_by;
    if (runs.length && runs.at(-1).by === by) runs.at(-1).end = step;
    else {
      if (runs.length) runs.at(-1).end = step;
      runs.push({ by, start: step, end: step });
    }
    runs.at(-1).chance = Math.max(runs.at(-1).chance ?? 0, step.chance ?? 0);
  }
  let lastDay = null;
  const items = runs.map(({ by, start, end, chance }) => {
    const [a, b] = [Date.parse(start.time), Date.parse(end.time)];
    const name = day(a, now);
    const heading = name === lastDay ? null : el("span", { class: "run-day" }, name);
    lastDay = name;
    const text = by === null ? words.unlimited : words.limitShort(by);
    const extra = chance > 0 ? ` (${words.windows.chance(chance)})` : "";
    return el("li", {}, ...(heading ? [heading] : []), el("span", { class: "run-time" }, `${hhmm(a)} – ${hhmm(b)}`), el("span", {}, text + extra));
  });
  byId("hours").replaceChildren(...items);
}

const textOf = (item) => (typeof item === "string" ? item : (item.text ?? [item.value, item.taken, item.why].filter((part) => part !== undefined && part !== null).join(": ")));
const fill = (id, items) => byId(id).replaceChildren(...items.map((item) => el("li", {}, textOf(item))));

export function showSources(outlook, feeds, received, now) {
  const { feed } = outlook;
  const age = feed?.age_s === null || feed?.age_s === undefined ? null : span(feed.age_s * 1000 + (now - received));
  const issued = feed?.issued && `${hhmm(Date.parse(feed.issued))} (${words.time.utc(hhmmUtc(Date.parse(feed.issued)))})`;
  const state = feeds?.find((f) => f.name === feed?.name);
  const failure = state?.last_failure;
  const lines = [feed ? words.feed.from(feed.name, issued, age) : words.feed.none];
  if (state && state.state !== "fresh") lines.push(words.feed.state(state.name, state.state));
  if (failure) lines.push(words.feed.failure(hhmm(Date.parse(failure.time)), failure.reason));
  setText(byId("feed"), lines.join(" "));
  fill("assumed", outlook.assumed);
  byId("assumed-title").hidden = outlook.assumed.length === 0;
  fill("cautions", outlook.cautions);
}
