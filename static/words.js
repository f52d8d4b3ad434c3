// Every word the page says. Another language is another module of this shape.

import { bearing, chance, degrees, fine, fists, percent, span, wind } from "./format.js";
import { RAIN_MM_H } from "./light.js";

/** Texts that stand still, by the data-word and data-label names in index.html. */
export const still = {
  sky_label: "The sky opposite the Sun",
  say_label: "What to do",
  windows_title: "Good windows",
  hours_title: "Hour by hour: what holds the bow back",
  weather_title: "Weather behind this",
  assumed_title: "Assumed, because the feed does not say",
  cautions_title: "Before you go",
  drawing_note:
    `The drawing is to scale: bearings from true north, heights in degrees and in fists at arm's length (about 10° each). Its colours are computed for rain of ${RAIN_MM_H} mm/h, as a camera set to daylight shows them; how strong the bow is drawn follows the contrast of the hour, with a trace left where none is likely. Without an answer from the server they show the order of the bands only. Times are those of your device.`,
  across_title: "Across the bow: brightness, colours, filter",
  across_caption: "Angle from the antisolar point. Dashed: the ray of geometry. Solid: where it is brightest. Below: how much of the rain's light is polarised along the arc.",
  across_note: `For rain of ${RAIN_MM_H} mm/h, all of it lit, of optical depth 1: the outlook does not tell the rain behind an hour. Behind it stands a grey cloud; what it sends is good to a factor of two.`,
  filter_title: "Polarising filter",
  dock_label: "Time and place",
  scrub_label: "Time",
  key_now: "Now",
  key_back: "−5 min",
  key_back_label: "−5 min: one step back",
  key_on: "+5 min",
  key_on_label: "+5 min: one step on",
  key_next: "Next bow",
  key_place: "Place",
  place_title: "Where do you stand?",
  locate: "Use my position",
  place_hint: "Or type it: degrees north and east, minus or S and W for south and west.",
  lat: "Latitude",
  lon: "Longitude",
  eye_height: "Eye above ground, m",
  close: "Close",
  show_place: "Show this place",
};

export const limits = {
  sun_down: "the Sun is below your horizon",
  sun_too_high: "the Sun is too high, the arc lies below the horizon",
  skyline: "the land around you hides the Sun or the arc",
  no_rain: "no rain in that part of the sky",
  sun_blocked: "cloud stands between the Sun and the rain",
  snow: "snow falls there, and snow makes no bow",
  too_faint: "the bow would be too faint to stand out",
  no_data: "no weather for this hour, the chance is unknown",
};
const limit = (name) => limits[name] ?? name;
const sentence = (text) => text.charAt(0).toUpperCase() + text.slice(1);

export const fistWords = (elevation_deg) => {
  const count = fists(elevation_deg);
  if (count === "0") return "under half a fist";
  return count === "½" || count === "1" ? `${count} fist` : `${count} fists`;
};

export const place = {
  position: (lat, lon) => `${lat}, ${lon}`,
  none: "No place chosen",
  locating: "Asking your device…",
  looking: "Looking…",
  locate_denied: "Your device did not give its position. Allow it in the browser's settings, or type it, or choose a site.",
  locate_unavailable: "Your device does not know where it is just now. Type the position or choose a site.",
  locate_timeout: "Your device took too long to find itself. Try again under open sky, or type the position.",
  locate_missing: "This browser gives no position here. Type it or choose a site.",
  fields_wrong: "Please check the marked fields.",
  unreachable: "No answer from the server. Check the connection and try again.",
};

export const dayWords = (days, name) => (days === 0 ? "today" : days === 1 ? "tomorrow" : name);

export const time = {
  now: "now",
  ahead: (ms) => `in ${span(ms)}`,
  ago: (ms) => `${span(ms)} ago`,
  utc: (text) => `${text} UTC`,
  range: (day, start, end) => (day ? `${day}, ${start} to ${end}` : `${start} to ${end}`),
};

/** The one line: what to do. `next` when the window is still to come at the time shown. */
export const say = {
  window: ({ face_azimuth_deg, crown_elevation_deg, best }, range, next) => [
    next ? "Next: face " : "Face ",
    bearing(face_azimuth_deg),
    `; crown ${degrees(crown_elevation_deg)} up; ${range}; chance ${chance(best.chance)}`,
  ],
  geometry: (step) => ["Face ", bearing(step.crown.azimuth_deg), `; crown ${degrees(step.crown.elevation_deg)} up; chance unknown`],
  unknown: ["Chance unknown: no weather for this place and time"],
  past: (hours) => [`No good window after this in these ${hours} hours`],
  none: (hours, best) => [best ? `No good window in the next ${hours} hours; the best chance is ${best}` : `No bow in the next ${hours} hours`],
  waiting: ["Reading the sky…"],
  nothing: ["No outlook yet"],
};

export const bestChance = (value, when) => `${chance(value)}, ${when}`;

/** Why, or why not, at the time shown. */
export function why(step, below_deg) {
  const { chance: c, limited_by: by, sun } = step;
  if (by === "sun_too_high" || (by === null && below_deg !== null && below_deg > 0)) {
    return below_deg > 0
      ? `No bow: the Sun stands ${fine(sun.elevation_deg)} up, too high. The crown lies ${fine(below_deg)} below the horizon.`
      : `No bow: ${limit("sun_too_high")}.`;
  }
  if (by === "sun_down" && sun.elevation_deg < 0) return `No bow: the Sun is ${fine(-sun.elevation_deg)} below the level horizon.`;
  if (c === null) return `${sentence(limit(by ?? "no_data"))}. The geometry still holds.`;
  if (by === null) return c > 0 ? "Sunlit rain may stand there: look." : "No bow.";
  if (c === 0) return `No bow: ${limit(by)}.`;
  return `What holds it back most: ${limit(by)}.`;
}

export const limitShort = (name) => sentence(limit(name));
export const unlimited = "Sunlit rain may stand in the arc";

export const facts = {
  face: ["Face", (az) => (az === null ? "–" : `${bearing(az)} ${wind(az)}`)],
  magnetic: ["By compass", (az) => (az === null ? "–" : bearing(az))],
  crown: ["Crown", (el) => (el === null ? "hidden" : `${fine(el)}, ${fistWords(el)}`)],
  feet: ["Feet", (left, right) => (left || right ? `${left ?? "–"} and ${right ?? "–"}` : "–")],
  second: ["Second bow", (el) => (el > 0 ? `crown ${fine(el)}` : "below the horizon")],
  arc: ["Arc in view", (text) => `${text} of the circle`],
  sun: ["Sun behind you", (az, el) => `${bearing(az)}, ${el < 0 ? `${fine(-el)} down` : `${fine(el)} up`}`],
  chance: ["Chance", (value) => (value === null ? "unknown" : chance(value))],
  prominence: ["Contrast", (value) => (value === null || value === undefined ? "–" : `${value < 0.01 && value > 0 ? "<0.01" : value.toFixed(2)} (0.02 just shows)`)],
};

const strength = (contrast) => (contrast < 0.02 ? "too faint to see" : contrast < 0.08 ? "faint" : contrast < 0.3 ? "clear" : contrast < 1 ? "bright" : "very bright");
const colours = (sun_deg) => (sun_deg < 2 ? "red, with little else" : sun_deg < 6 ? "mostly red and orange, weak in blue" : "in all its colours");
const tenth = (value) => `${value.toFixed(1)}°`;
/** How to turn a filter to an arc that leans so: 0 is level, 90 upright, less leans right at its top. */
const lean = (deg) => (deg > 88 && deg < 92 ? "upright" : `${degrees(deg < 90 ? deg : 180 - deg)} from level, its top ${deg < 90 ? "to the right" : "to the left"}`);

export const light = {
  expect: (contrast, sun_deg, known) => `${known ? "The bow of this hour, if it comes" : "With such rain"}: ${strength(contrast)}${contrast < 0.02 ? "" : `, ${colours(sun_deg)}`}.`,
  waiting: "The light of this hour has not come from the server yet.",
  sun_down: "The Sun is down: no light to make a bow.",
  names: ["primary", "secondary"],
  short: ["1st", "2nd"],
  luminance: (most) => `${most.toLocaleString("en-GB")} cd/m²`,
  polarised: "polarised, 0 to 100 %",
  angle: (deg) => `${deg}°`,
  facts: ({ bows, supernumeraries }) => [
    ...bows.map((bow, i) => [
      ["Primary", "Secondary"][i],
      `ray ${tenth(bow.radius_deg)}, ${bow.brightest_deg === null ? "no peak" : `brightest ${tenth(bow.brightest_deg)}`}${bow.width_deg === null ? "" : `, ${tenth(bow.width_deg)} wide`}, contrast ${bow.contrast.toFixed(2)}${bow.degree_of_polarisation === null ? "" : `, ${percent(bow.degree_of_polarisation)} polarised`}`,
    ]),
    ["Supernumerary bows", supernumeraries === 0 ? "none that show in such rain" : String(supernumeraries)],
  ],
  polariser: ({ along_passes, across_passes }, leans) => [
    `The bow's light swings along the arc. With the filter's axis along the arc ${percent(along_passes)} of it passes, across it ${percent(across_passes)}: there the bow all but vanishes.`,
    "Crown: strongest with the axis level, gone with the axis upright.",
    ...["Left foot", "Right foot"].flatMap((name, i) => (leans[i] === null ? [] : [`${name}: strongest with the axis ${lean(leans[i])}; gone a quarter turn from there.`])),
    "One turn does not suit the whole arc: a wide lens shows part of it strong and part of it gone.",
  ],
  describe: ({ bows }) =>
    `Luminance across the bow: ${bows.map((bow, i) => `${light.names[i]} brightest at ${bow.brightest_deg === null ? "no angle" : tenth(bow.brightest_deg)}, contrast ${bow.contrast.toFixed(2)}`).join("; ")}.`,
};

export const windows = {
  none: "None. See below what stands in the way, and come back when the weather turns.",
  unknown: "Unknown while there is no weather for this place.",
  face: ({ face_azimuth_deg, face_magnetic_deg }) =>
    `Face ${bearing(face_azimuth_deg)} ${wind(face_azimuth_deg)}${face_magnetic_deg === null ? "" : ` (compass ${bearing(face_magnetic_deg)})`}`,
  crown: (el) => `crown ${degrees(el)} up, ${fistWords(el)}`,
  chance: (value) => `chance ${chance(value)}`,
  best: (text) => `best ${text}`,
};

export const sky = {
  face: (az) => `Face ${bearing(az)} ${wind(az)}`,
  crown: (el) => `crown ${fine(el)}`,
  hidden: (below_deg) => (below_deg > 0 ? ["crown " + fine(below_deg), "below the horizon"] : ["behind the land"]),
  antisolar: (el) => ["antisolar point", `${fine(-el)} down`],
  sun_down: "the Sun is down",
  empty: "An empty horizon: no outlook yet.",
  staff_degrees: (el) => `${el}°`,
  staff_fists: (el) => (el === 10 ? "1 fist" : `${el / 10}`),
  describe: (when, step, feet) =>
    step.sun.elevation_deg < 0
      ? `${when}: the Sun is down, no bow.`
      : step.crown
        ? `${when}: bow opposite the Sun, facing ${bearing(step.antisolar_point.azimuth_deg)}, crown ${degrees(step.crown.elevation_deg)} up${feet}.`
        : `${when}: the bow lies below the horizon, facing ${bearing(step.antisolar_point.azimuth_deg)}.`,
  feet: (left, right) => (left && right ? `, feet at ${left} and ${right}` : ""),
};

export const tape = {
  value: (when, step, face) =>
    `${when}, ${step.chance === null ? "chance unknown" : `chance ${chance(step.chance)}`}, ${step.crown ? `face ${face}, crown ${degrees(step.crown.elevation_deg)} up` : "no arc in view"}`,
};

const STATES = {
  never_fetched: "has not been asked yet",
  fresh: "is fresh",
  stale: "is old",
  failing: "is failing",
};
export const feed = {
  from: (name, issued, age) => `From ${name}${issued ? `, issued ${issued}` : ""}${age ? `, ${age} old` : ""}.`,
  none: "No weather feed is set up. The geometry holds; the chance is unknown.",
  state: (name, state) => `${name} ${STATES[state] ?? state}.`,
  failure: (when, reason) => `Last failure ${when}: ${reason}`,
};

export const notice = {
  loading: "Fetching the outlook…",
  network: "No answer from the server.",
  timeout: "The server took too long.",
  problem: (detail) => `The server refused: ${detail || "no reason given"}`,
  kept: (age) => `Shown: the answer of ${age} ago.`,
  stale: (age) => `Old weather${age ? ` (${age})` : ""}: trust the geometry, not the chance.`,
  failing: "The weather feed is failing; the last good weather is shown.",
  no_data: "No weather for this place: Sun and bow hold, the chance is unknown.",
  retry: "Try again",
};
