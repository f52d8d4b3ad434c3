// Light across the bow for the stand-in server: plausible, not true. Each part of the colour has a bow at its own radius, with light inside
// the primary and outside the secondary; the lower the Sun, the less green and blue.

import { RADII } from "./mocksky.mjs";

const ANGLES = Array.from({ length: 601 }, (_, i) => Math.round(3000 + 5 * i) / 100);
const PARTS = [[RADII.primary.red - 0.35, RADII.secondary.red + 0.4], [RADII.primary.green - 0.1, RADII.secondary.green], [RADII.primary.violet + 0.2, RADII.secondary.violet]];
const bell = (x, width) => Math.exp(-0.5 * (x / width) ** 2);
const WEIGHTS = [0.2126, 0.7152, 0.0722];

/** Phase function of a part of the colour, about as rain has it. */
const phase = ([primary, secondary], angle_deg) =>
  0.02 + 0.85 * bell(angle_deg - primary, 0.45) + (angle_deg < primary ? 0.15 + 0.3 * bell(angle_deg - primary, 5) : 0) + 0.1 * bell(angle_deg - secondary, 0.7) + (angle_deg > secondary ? 0.03 : 0);

export function lightAnswer(query) {
  const sun_elevation_deg = Number(query.get("sun_elevation_deg"));
  const through = [0.02, 0.06, 0.14].map((depth) => Math.exp((-depth * 38) / (1 + 0.7 * Math.max(0, sun_elevation_deg) ** 1.2)));
  const white = 6000 * through[1] * Math.sin(((sun_elevation_deg + 3) * Math.PI) / 180);
  const linear = ANGLES.map((a) => PARTS.map((part, k) => (0.6 + phase(part, a)) * (k === 1 ? 1 : through[k] / through[1])));
  const luminance = linear.map((rgb) => rgb.reduce((sum, part, k) => sum + WEIGHTS[k] * part, 0));
  const greatest = Math.max(...linear.flat());
  const dark = Math.min(...luminance.slice(240, 420));
  const bow = (order, from, to) => {
    const peak = luminance.indexOf(Math.max(...luminance.slice(from, to)), from);
    const radius_deg = [RADII.primary, RADII.secondary][order - 1].green;
    return { order, radius_deg, brightest_deg: ANGLES[peak], width_deg: order * 0.9, contrast: luminance[peak] / dark - 1, degree_of_polarisation: order === 1 ? 0.9 : 0.73 };
  };
  return {
    sun_elevation_deg, drops: { rain_mm_h: Number(query.get("rain_mm_h")) }, angle_deg: ANGLES,
    degree_of_polarisation: ANGLES.map((a) => Math.max(0.9 * bell(a - 41.8, 3), 0.73 * bell(a - 51.5, 3))),
    luminance_cd_m2: luminance.map((y) => y * white), linear_srgb: linear.map((rgb) => rgb.map((part) => part / greatest)), white_cd_m2: white * greatest,
    bows: [bow(1, 180, 300), bow(2, 390, 520)], supernumeraries: 0, contrast_threshold: 0.02,
    polariser: { along_passes: 0.95, across_passes: 0.05, crown_axis_deg: 0, left_foot_axis_deg: 90, right_foot_axis_deg: 90 },
  };
}
