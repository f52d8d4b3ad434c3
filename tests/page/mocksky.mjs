// Sun and bow for the stand-in server, computed apart from static/sky.js so that the two check each other.
// Sun: the low-precision formulas of the Astronomical Almanac (from memory; about 0.01°). Refraction: Saemundsson 1986 (from memory).

const R = Math.PI / 180;
export const RADII = {
  primary: { red: 42.39, green: 41.78, violet: 40.52 },
  secondary: { red: 50.33, green: 51.42, violet: 53.71 },
};

export function sunAt(ms, lat, lon) {
  const d = ms / 86400e3 - 10957.5;
  const g = (357.529 + 0.98560028 * d) * R;
  const q = 280.459 + 0.98564736 * d;
  const l = (q + 1.915 * Math.sin(g) + 0.02 * Math.sin(2 * g)) * R;
  const e = (23.439 - 0.00000036 * d) * R;
  const declination = Math.asin(Math.sin(e) * Math.sin(l));
  const ascension = Math.atan2(Math.cos(e) * Math.sin(l), Math.cos(l)) / R;
  const sidereal = 280.46061837 + 360.98564736629 * d;
  const hour = (sidereal + lon - ascension) * R;
  const [f, c] = [lat * R, Math.cos(declination)];
  const east = -c * Math.sin(hour);
  const north = Math.sin(declination) * Math.cos(f) - c * Math.cos(hour) * Math.sin(f);
  const up = Math.sin(declination) * Math.sin(f) + c * Math.cos(hour) * Math.cos(f);
  const airless = Math.asin(up) / R;
  const lift = airless > -2 ? 1.02 / Math.tan((airless + 10.3 / (airless + 5.11)) * R) / 60 : 0;
  return { azimuth_deg: (Math.atan2(east, north) / R + 360) % 360, elevation_deg: airless + lift, airless_elevation_deg: airless };
}

export function horizonFor(observer, azimuth) {
  const line = observer.skyline ?? [];
  if (!line.length) return -observer.dip_deg;
  const i = line.findIndex(([a]) => a > azimuth);
  const [a1, h1] = line[i < 0 ? 0 : i];
  const [a0, h0] = line.at(i < 0 ? -1 : i - 1);
  return h0 + (h1 - h0) * (((azimuth - a0 + 360) % 360) / (((a1 - a0 + 360) % 360) || 360));
}

/** Elevation and azimuth offset of the circle at position angle p from its top, by the cosine rule. */
function around(h, radius, p) {
  const el = Math.asin(Math.sin(h * R) * Math.cos(radius * R) + Math.cos(h * R) * Math.sin(radius * R) * Math.cos(p * R)) / R;
  const az = Math.atan2(Math.sin(radius * R) * Math.sin(p * R) * Math.cos(h * R), Math.cos(radius * R) - Math.sin(h * R) * Math.sin(el * R)) / R;
  return { el, az };
}

/** Crown, feet and share of a circle round the antisolar point, by walking it. */
export function bow(anti, radius, observer) {
  const seen = (p) => {
    const { el, az } = around(anti.elevation_deg, radius, p);
    const azimuth_deg = (anti.azimuth_deg + az + 360) % 360;
    return { azimuth_deg, elevation_deg: el, clear: el > horizonFor(observer, azimuth_deg) };
  };
  const STEP = 0.02;
  let [count, crown, left, right] = [0, null, null, null];
  for (let p = STEP / 2; p < 180; p += STEP) {
    for (const side of [-1, 1]) {
      const d = seen(side * p);
      if (!d.clear) continue;
      count += 1;
      if (!crown || d.elevation_deg > crown.elevation_deg) crown = { azimuth_deg: d.azimuth_deg, elevation_deg: d.elevation_deg };
      if (side < 0) left = d.azimuth_deg;
      else right = d.azimuth_deg;
    }
  }
  const whole = count * STEP > 359.9;
  return { crown, feet: whole || left === null || right === null ? null : { left_azimuth_deg: left, right_azimuth_deg: right }, visible_arc_fraction: (count * STEP) / 360 };
}
