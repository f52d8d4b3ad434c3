// The bow's own light by the height of the Sun: a few answers of the service, and what lies between them. No DOM in here.

import { fetchLight } from "./api.js";

/** The rain whose light is asked for, mm/h: the outlook does not tell the rate behind a step. */
export const RAIN_MM_H = 5;
/**
 * Heights of the Sun that are asked for, degrees. What lies between is mixed by log(h + 3): colours on the screen then are within
 * 0.03 of their range, luminance (by its logarithm) and contrast within 14 %.
 */
export const SUNS_DEG = [0, 1, 3, 7, 16, 45];
/** What makes the sunlight at 45° white, in linear sRGB, its luminance kept: the setting "daylight" of a camera. */
const DAYLIGHT = [0.847, 1.031, 1.304];
const place = (sun_deg) => Math.log(Math.max(sun_deg, 0) + 3);

/** Answers by height, and the requests under way. */
const answers = new Map();
const asked = new Map();

/** Answers to both sides of a height, and the share of the upper one. */
function between(sun_deg) {
  const next = SUNS_DEG.findIndex((s, i) => i > 0 && s >= sun_deg);
  const upper = next === -1 ? SUNS_DEG.length - 1 : next;
  const [low, high] = [SUNS_DEG[upper - 1], SUNS_DEG[upper]];
  const share = (place(sun_deg) - place(low)) / (place(high) - place(low));
  return { low, high, share: Math.min(1, Math.max(0, share)) };
}

function ask(sun_elevation_deg) {
  if (!asked.has(sun_elevation_deg)) {
    const request = fetchLight({ sun_elevation_deg, rain_mm_h: RAIN_MM_H }, new AbortController().signal);
    asked.set(sun_elevation_deg, request.then((answer) => answers.set(sun_elevation_deg, answer)));
    request.catch(() => asked.delete(sun_elevation_deg));
  }
  return asked.get(sun_elevation_deg);
}

/** Asks, once each, for the answers that the heights of an outlook's Suns need. Resolves when all are there; rejects with the first failure. */
export function askLight(suns_deg) {
  const wanted = new Set();
  for (const sun of suns_deg) {
    if (sun < -0.5) continue;
    const { low, high } = between(sun);
    wanted.add(low).add(high);
  }
  return Promise.all([...wanted].map(ask));
}

const mix = (a, b, share) => a + (b - a) * share;
const mixLogs = (a, b, share) => a ** (1 - share) * b ** share;
const mixKnown = (a, b, share) => (a === null || b === null ? (share < 0.5 ? a : b) : mix(a, b, share));

/** Index of the least of a list within a range. */
const least = (list, from, to) => {
  let best = from;
  for (let i = from; i < to; i += 1) if (list[i] < list[best]) best = i;
  return best;
};

/**
 * Light across the bow for a height of the Sun; null while its answers are not there. `linear` is scaled so that the sky between
 * the bows, at index `dark`, has a luminance of 1.
 */
export function lightAt(sun_deg) {
  const { low, high, share } = between(sun_deg);
  const [a, b] = [answers.get(low), answers.get(high)];
  if (!a || !b) return null;
  const lists = (name, way) => a[name].map((value, i) => way(value, b[name][i], share));
  const luminance_cd_m2 = lists("luminance_cd_m2", mixLogs);
  const [from, to] = [a.bows[0].brightest_deg, a.bows[1].brightest_deg].map((angle) => Math.round((angle - 30) / 0.05));
  const dark = least(luminance_cd_m2, from, to);
  const scaled = (answer) => answer.white_cd_m2 / answer.luminance_cd_m2[dark];
  const [wa, wb] = [scaled(a), scaled(b)];
  const linear = a.linear_srgb.map((rgb, i) => rgb.map((part, k) => DAYLIGHT[k] * mix(part * wa, b.linear_srgb[i][k] * wb, share)));
  const bows = a.bows.map((bow, i) => {
    const other = b.bows[i];
    const known = (name) => mixKnown(bow[name], other[name], share);
    const mixed = Object.fromEntries(["brightest_deg", "width_deg", "degree_of_polarisation"].map((name) => [name, known(name)]));
    return { ...bow, ...mixed, contrast: mixLogs(bow.contrast, other.contrast, share) };
  });
  const { supernumeraries, polariser } = share < 0.5 ? a : b;
  return { angle_deg: a.angle_deg, luminance_cd_m2, degree_of_polarisation: lists("degree_of_polarisation", mix), linear, dark, bows, polariser, supernumeraries };
}

/** Encoding of IEC 61966-2-1 (sRGB) for a linear part, with what lies outside cut off. */
export const encode = (part) => {
  const p = Math.min(1, Math.max(0, part));
  return p <= 0.0031308 ? 12.92 * p : 1.055 * p ** (1 / 2.4) - 0.055;
};

/** A picture's contrast over that of the scene, by which it looks right though it is small and dim (common practice: 1.2 to 1.5). */
const GAMMA = 1.4;

/** A linear colour of luminance about 1 as CSS, exposed so that 1 becomes `grey` (linear). What lies outside sRGB is mixed with grey of its own luminance. */
export function css(rgb, grey) {
  const y = 0.2126 * rgb[0] + 0.7152 * rgb[1] + 0.0722 * rgb[2];
  const lowest = Math.min(...rgb);
  const keep = lowest < 0 ? y / (y - lowest) : 1;
  return `rgb(${rgb.map((part) => Math.round(255 * encode(grey * Math.max(0, y + keep * (part - y)) ** GAMMA))).join(" ")})`;
}
