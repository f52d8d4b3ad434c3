// Directions in the sky and where they fall on the drawing. No DOM in here.
//
// Directions are unit vectors (east, north, up); azimuth runs clockwise from true north, elevation is positive
// above the horizontal, degrees throughout.
//
// The drawing is a stereographic projection (Snyder, Map Projections: A Working Manual, 1987, p. 154, on the unit sphere)
// centred on the level horizon at the azimuth faced. With r, u, f the components of a direction to the right, up and
// forward:
//     x = 2 r / (1 + f)      y = 2 u / (1 + f)
// It is chosen for what it keeps: every circle on the sky (a bow, the dipped horizon) stays an exact circle, the level
// horizon stays a straight line, and small shapes keep their shape. Scale grows from 1 at the centre to 1.26 at 54°.

const RAD = Math.PI / 180;

export function direction({ azimuth_deg, elevation_deg }) {
  const a = azimuth_deg * RAD;
  const h = elevation_deg * RAD;
  return [Math.sin(a) * Math.cos(h), Math.cos(a) * Math.cos(h), Math.sin(h)];
}

export function angles([east, north, up]) {
  return {
    azimuth_deg: (Math.atan2(east, north) / RAD + 360) % 360,
    elevation_deg: Math.atan2(up, Math.hypot(east, north)) / RAD,
  };
}

/** Angle between two directions, degrees. */
export function separation(a, b) {
  const [p, q] = [direction(a), direction(b)];
  const cross = [p[1] * q[2] - p[2] * q[1], p[2] * q[0] - p[0] * q[2], p[0] * q[1] - p[1] * q[0]];
  return Math.atan2(Math.hypot(...cross), p[0] * q[0] + p[1] * q[1] + p[2] * q[2]) / RAD;
}

/** Smallest turn from `from` to `to`, in (-180, 180]. */
export const turn = (from, to) => {
  const d = (((to - from) % 360) + 360) % 360;
  return d > 180 ? d - 360 : d;
};

/**
 * A projection: `azimuth_deg` faced, `scale` in pixels per unit (pixels per radian at the centre), and the pixel
 * (`x0`, `y0`) of the centre, which lies on the level horizon.
 */
export function projection({ azimuth_deg, scale, x0, y0 }) {
  const sin = Math.sin(azimuth_deg * RAD);
  const cos = Math.cos(azimuth_deg * RAD);
  const local = (d) => {
    const [e, n, u] = direction(d);
    return [e * cos - n * sin, u, e * sin + n * cos];
  };
  return {
    azimuth_deg,
    scale,
    x0,
    y0,
    /** Pixel of a direction. The direction straight behind has none. */
    project(d) {
      const [r, u, f] = local(d);
      const k = (2 * scale) / (1 + f);
      return { x: x0 + k * r, y: y0 - k * u };
    },
    /** Direction of a pixel. */
    unproject({ x, y }) {
      const px = (x - x0) / scale;
      const py = (y0 - y) / scale;
      const q = px * px + py * py;
      const r = (4 * px) / (4 + q);
      const f = (4 - q) / (4 + q);
      return angles([r * cos + f * sin, -r * sin + f * cos, (4 * py) / (4 + q)]);
    },
    /** Pixel circle of the sky circle of `radius_deg` round `axis`. Valid while the point straight behind lies outside it. */
    circle(axis, radius_deg) {
      const [r, u, f] = local(axis);
      const k = (2 * scale) / (f + Math.cos(radius_deg * RAD));
      return { cx: x0 + k * r, cy: y0 - k * u, r: k * Math.sin(radius_deg * RAD) };
    },
  };
}

/** The frame that always holds the whole scene: feet of the secondary at the sides, its crown above, a high Sun's point below. */
const FRAME = { side_deg: 58, top_deg: 57, bottom_deg: 47 };
const reach = (deg) => 2 * Math.tan((deg * RAD) / 2);

/** Projection that fits the frame into `width` x `height` pixels. */
export function fit(azimuth_deg, width, height) {
  const [side, top, bottom] = [reach(FRAME.side_deg), reach(FRAME.top_deg), reach(FRAME.bottom_deg)];
  const scale = Math.min(width / (2 * side), height / (top + bottom));
  const spare = height - scale * (top + bottom);
  return projection({ azimuth_deg, scale, x0: width / 2, y0: scale * top + spare * 0.6 });
}

/** The direction on the circle of `radius_deg` round `axis`, at `position_deg` from its top, to the right. */
export function onCircle(axis, radius_deg, position_deg) {
  const [e, n, u] = direction(axis);
  const a = axis.azimuth_deg * RAD;
  const right = [Math.cos(a), -Math.sin(a), 0];
  const top = [-u * Math.sin(a), -u * Math.cos(a), Math.hypot(e, n)];
  const [c, s] = [Math.cos(radius_deg * RAD), Math.sin(radius_deg * RAD)];
  const [p, q] = [Math.cos(position_deg * RAD), Math.sin(position_deg * RAD)];
  return angles([0, 1, 2].map((i) => c * [e, n, u][i] + s * (p * top[i] + q * right[i])));
}

/** How an arc round `axis` leans at a point on it: its tangent's angle from the horizontal, counter-clockwise as seen, degrees in [0, 180). */
export function arcLean(axis, { azimuth_deg, elevation_deg }) {
  const [p, q] = [direction(axis), direction({ azimuth_deg, elevation_deg })];
  const tangent = [p[1] * q[2] - p[2] * q[1], p[2] * q[0] - p[0] * q[2], p[0] * q[1] - p[1] * q[0]];
  const [a, h] = [azimuth_deg * RAD, elevation_deg * RAD];
  const along = (v) => tangent[0] * v[0] + tangent[1] * v[1] + tangent[2] * v[2];
  const right = along([Math.cos(a), -Math.sin(a), 0]);
  const up = along([-Math.sin(h) * Math.sin(a), -Math.sin(h) * Math.cos(a), Math.cos(h)]);
  return (Math.atan2(up, right) / RAD + 360) % 180;
}

/** Elevation of the horizon in use at an azimuth: the skyline, straight between its points and round through north, else minus the dip. */
export function horizonAt({ dip_deg = 0, skyline = [] }, azimuth_deg) {
  if (skyline.length === 0) return -dip_deg;
  const next = skyline.findIndex(([az]) => az > azimuth_deg);
  const [az1, el1] = skyline[next === -1 ? 0 : next];
  const [az0, el0] = skyline.at(next === -1 ? -1 : next - 1);
  const span = (az1 - az0 + 360) % 360 || 360;
  return el0 + ((el1 - el0) * ((azimuth_deg - az0 + 360) % 360)) / span;
}

/** Lowest visible direction of a bow on its left (-1) or right (+1) half, to 0.001° of the circle; null when that half has no foot. */
export function foot(axis, radius_deg, horizon, side) {
  const clear = (position) => {
    const d = onCircle(axis, radius_deg, side * position);
    return d.elevation_deg > horizonAt(horizon, d.azimuth_deg);
  };
  let hidden = 180;
  if (clear(hidden)) return null;
  let seen = hidden;
  while (!clear(seen)) {
    hidden = seen;
    seen -= 0.5;
    if (seen < 0) return null;
  }
  while (hidden - seen > 0.001) {
    const middle = (hidden + seen) / 2;
    if (clear(middle)) seen = middle;
    else hidden = middle;
  }
  return onCircle(axis, radius_deg, side * hidden);
}

/** How far below a level or dipped horizon the red crown of the primary lies when no part of the arc shows; null while some does. */
export function belowHorizon({ crown, antisolar_point }, { radius_deg, observer }) {
  if (crown) return null;
  return -(antisolar_point.elevation_deg + radius_deg.primary.red) - observer.horizon.dip_deg;
}

/** Radius of a bow at a wavelength: the parabola through the three radii the service gives (700, 550 and 400 nm). */
export function radiusAt({ red, green, violet }, wavelength_nm) {
  const t = (wavelength_nm - 550) / 150;
  return green + ((red - violet) / 2) * t + ((red + violet) / 2 - green) * t * t;
}
