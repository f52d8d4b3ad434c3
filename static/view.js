// Draws the sky opposite the Sun into one SVG: sky, bows in their true radii, land, then marks and figures.
// The land is painted over the bows; what lies below the horizon shows on it as a dashed line.

import { BowLight } from "./bowlight.js";
import { set, setText, svg } from "./dom.js";
import { bearing, wind } from "./format.js";
import { lightAt } from "./light.js";
import { belowHorizon, fit, foot, horizonAt, radiusAt, turn } from "./sky.js";
import * as words from "./words.js";

/** Bands across a bow: wavelength in nm of the outer edge in wavelength, and a colour by eye (order of the bands, not their tint). */
const BANDS = [
  [700, "#a8301e"], [672, "#dc4527"], [645, "#f0592b"], [620, "#f77a33"], [600, "#fba544"], [580, "#f6d25a"],
  [558, "#c9dc62"], [535, "#7fca73"], [510, "#55b795"], [485, "#4c9cc0"], [460, "#5079b4"], [430, "#564f8c"],
];
const END_NM = 400;
/** Contrast of the trace of a bow where none is likely. */
const TRACE = 0.15;
const STAFF = [10, 20, 30, 40, 50];

const bowNodes = (name) => {
  const bands = BANDS.map(([, colour]) => svg("circle", { class: "band", stroke: colour }));
  const edge = () => svg("circle", { class: `edge ${name}` });
  return { name, group: svg("g", {}, ...bands), bands, edges: [edge(), edge()] };
};

/** Width of a text in pixels, near enough to keep labels apart. */
const textWidth = (text, size) => text.length * size * 0.6;

export class SkyView {
  constructor(node) {
    this.node = node;
    const gradient = (id, ...stops) =>
      svg("linearGradient", { id, x1: 0, y1: 0, x2: 0, y2: 1 }, ...stops.map((c, i) => svg("stop", { offset: i / (stops.length - 1), class: c })));
    this.air = svg("rect", { fill: "url(#air)" });
    this.glow = svg("rect", { fill: "url(#glow)" });
    this.dark = svg("path", { class: "dark-band", "fill-rule": "evenodd" });
    this.inside = svg("circle", { class: "inside" });
    this.bows = ["primary", "secondary"].map(bowNodes);
    this.light = new BowLight();
    this.land = svg("path", { fill: "url(#land)", class: "land" });
    this.lit = svg("path", { class: "lit" });
    this.below = svg("path");
    this.night = svg("rect", { class: "night" });
    this.plumb = svg("line", { class: "plumb" });
    this.staff = svg("g", { class: "staff" });
    this.ring = svg("g", { class: "bearings" });
    this.marks = svg("g", { class: "marks" });
    node.append(
      svg("defs", {}, gradient("air", "air-top", "air-low"), gradient("glow", "glow-top", "glow-low"), gradient("land", "land-top", "land-low"), ...this.light.defs, svg("clipPath", { id: "below" }, this.below)),
      this.air, this.glow, this.inside, this.dark, ...this.bows.map((b) => b.group), this.light.node, ...this.bows.map((b) => b.edges[0]), this.land, this.lit, this.night,
      svg("g", { "clip-path": "url(#below)" }, ...this.bows.map((b) => b.edges[1])), this.plumb, this.staff, this.ring, this.marks,
    );
  }

  /** Reads the size on the page; call when it may have changed. */
  measure() {
    const { width, height } = this.node.getBoundingClientRect();
    this.width = Math.max(width, 1);
    this.height = Math.max(height, 1);
    this.size = parseFloat(getComputedStyle(this.node).fontSize);
    set(this.node, { viewBox: `0 0 ${this.width} ${this.height}` });
    for (const rect of [this.air, this.glow, this.night]) set(rect, { width: this.width, height: this.height });
    this.light.measure(this.width, this.height);
  }

  /** The projection for an azimuth faced; the strip below the frame is kept for the words "Face …". */
  camera(azimuth_deg) {
    return fit(azimuth_deg, this.width, this.height - 2 * this.size);
  }

  /** Sky and level land before any answer has come. */
  drawEmpty() {
    this.drawLand(this.camera(0), { dip_deg: 0, skyline: [] });
    set(this.night, { opacity: 0.25 });
    setText(this.title(), words.sky.empty);
  }

  /** Draws one step of an outlook, and leaves the parameters of its projection on the node, as data. */
  draw(step, outlook, label) {
    const axis = step.antisolar_point;
    const horizon = outlook.observer.horizon;
    const camera = this.camera(axis.azimuth_deg);
    const sun_up = step.sun.elevation_deg > 0;
    const radii = outlook.radius_deg;
    for (const name of ["azimuth_deg", "scale", "x0", "y0"]) this.node.dataset[name] = camera[name];
    this.drawLight(step.sun.elevation_deg);
    this.drawBows(camera, axis, radii, step, sun_up);
    this.drawComputed(camera, axis, step, sun_up);
    this.drawLand(camera, horizon);
    const feet = sun_up ? [-1, 1].map((side) => foot(axis, radii.primary.red, horizon, side)) : [null, null];
    this.drawMarks(camera, step, axis, feet, horizon, sun_up, belowHorizon(step, outlook));
    const [left, right] = feet.map((f) => f && bearing(f.azimuth_deg));
    setText(this.title(), words.sky.describe(label, step, words.sky.feet(left, right)));
    return { left, right, directions: feet };
  }

  title() {
    if (!this.titleNode) {
      this.titleNode = svg("title", { id: "sky-title" });
      this.node.prepend(this.titleNode);
      set(this.node, { "aria-labelledby": "sky-title" });
    }
    return this.titleNode;
  }

  /** The lower the Sun, the warmer; below the horizon, dark. */
  drawLight(sun_deg) {
    const low = Math.max(0, 1 - Math.abs(sun_deg - 2) / 22);
    set(this.glow, { opacity: (sun_deg > -6 ? 0.15 + 0.85 * low : 0.1).toFixed(2) });
    set(this.night, { opacity: Math.min(0.8, Math.max(0, (1 - sun_deg) / 10)).toFixed(2) });
  }

  /** The light that the service computed, over the colours by eye; those stay until it has come. */
  drawComputed(camera, axis, step, sun_up) {
    const { elevation_deg } = step.sun;
    const light = elevation_deg > -0.5 ? lightAt(elevation_deg) : null;
    // Where no bow is likely a trace is left, to show where it would stand.
    const contrast = step.prominence === null ? light?.bows[0].contrast : Math.max(step.prominence, TRACE);
    const strength = sun_up && light ? contrast / light.bows[0].contrast : 0;
    this.light.draw(camera, axis, light, strength, Math.min(1, elevation_deg + 0.5).toFixed(2));
    if (light) {
      for (const node of [this.dark, this.inside, ...this.bows.map((b) => b.group)]) set(node, { opacity: 0 });
      if (sun_up) for (const { edges } of this.bows) set(edges[0], { opacity: 0.4 });
    }
    this.node.dataset.light = light ? "computed" : "by-eye";
  }

  drawBows(camera, axis, radii, step, sun_up) {
    const strength = step.chance === null ? 0.3 : 0.3 + 0.7 * Math.min(1, step.chance * 1.25);
    for (const { name, bands, group, edges } of this.bows) {
      set(group, { opacity: sun_up ? (strength * (name === "primary" ? 1 : 0.45)).toFixed(2) : 0 });
      for (const edge of edges) set(edge, { ...camera.circle(axis, radii[name].red), opacity: sun_up ? 1 : 0 });
      bands.forEach((band, i) => {
        const from = camera.circle(axis, radiusAt(radii[name], BANDS[i][0]));
        const to = camera.circle(axis, radiusAt(radii[name], BANDS[i + 1]?.[0] ?? END_NM));
        set(band, { cx: (from.cx + to.cx) / 2, cy: (from.cy + to.cy) / 2, r: (from.r + to.r) / 2, "stroke-width": Math.abs(from.r - to.r) + 0.6 });
      });
    }
    const disc = ({ cx, cy, r }) => `M${cx - r} ${cy}a${r} ${r} 0 1 0 ${2 * r} 0a${r} ${r} 0 1 0 ${-2 * r} 0z`;
    set(this.dark, {
      d: disc(camera.circle(axis, radii.primary.red)) + disc(camera.circle(axis, radii.secondary.red)),
      opacity: sun_up ? strength.toFixed(2) : 0,
    });
    set(this.inside, { ...camera.circle(axis, radii.primary.violet), opacity: sun_up ? strength.toFixed(2) : 0 });
  }

  drawLand(camera, horizon) {
    const half = Math.min(170, (2 * Math.atan(this.width / 2 / camera.scale / 2) * 180) / Math.PI + 2);
    const offsets = [];
    for (let d = -half; d < half; d += 2) offsets.push(d);
    offsets.push(half);
    for (const [az] of horizon.skyline) {
      const d = turn(camera.azimuth_deg, az);
      if (Math.abs(d) < half) offsets.push(d);
    }
    const points = offsets
      .sort((a, b) => a - b)
      .map((d) => {
        const azimuth_deg = (camera.azimuth_deg + d + 360) % 360;
        const { x, y } = camera.project({ azimuth_deg, elevation_deg: horizonAt(horizon, azimuth_deg) });
        return `${x.toFixed(2)} ${y.toFixed(2)}`;
      });
    set(this.lit, { d: `M${points.join("L")}` });
    for (const land of [this.land, this.below]) set(land, { d: `M${points.join("L")}L${this.width + 40} ${this.height + 2}L-40 ${this.height + 2}z` });
  }

  drawMarks(camera, step, axis, feet, horizon, sun_up, below_deg) {
    const { size, width, height } = this;
    const az = axis.azimuth_deg;
    const at = (elevation_deg, azimuth_deg = az) => camera.project({ azimuth_deg, elevation_deg });
    const text = (x, y, content, attributes = {}) => svg("text", { x: x.toFixed(1), y: y.toFixed(1), ...attributes }, content);
    const marks = [];
    const mark = (name, d) => {
      const { x, y } = camera.project(d);
      marks.push(svg("circle", { class: "mark", "data-mark": name, cx: x, cy: y, r: size * 0.3 }));
      return { x, y };
    };

    const bottom = height - size * 2;
    const crown = sun_up && step.crown ? mark("crown", step.crown) : null;
    const top = crown ? crown.y : at(0).y;
    set(this.plumb, { x1: width / 2, x2: width / 2, y1: top, y2: bottom, opacity: sun_up ? 1 : 0 });
    if (crown) marks.push(text(crown.x, crown.y - size * 0.6, words.sky.crown(step.crown.elevation_deg), { class: "big", "text-anchor": "middle" }));
    if (sun_up) marks.push(text(width / 2, height - size * 0.65, words.sky.face(az), { class: "face", "text-anchor": "middle" }));

    // bearings along the horizon: the feet first, then the even ones that still find room
    const level = -horizon.dip_deg;
    const row = at(level).y + size * 1.5;
    const taken = [[width / 2 - size * 0.6, width / 2 + size * 0.6]];
    const place = (x, content, attributes) => {
      const w = textWidth(content, size) + size * 0.5;
      const free = x - w / 2 > 0 && x + w / 2 < width && taken.every(([a, b]) => x + w / 2 < a || x - w / 2 > b);
      if (free) {
        taken.push([x - w / 2, x + w / 2]);
        ring.push(text(x, row, content, { "text-anchor": "middle", ...attributes }));
      }
    };
    const ring = [];
    feet.forEach((f, i) => {
      if (!f || Math.abs(turn(az, f.azimuth_deg)) > 100) return;
      const { x, y } = mark(i ? "right-foot" : "left-foot", f);
      ring.push(svg("line", { class: "tick", x1: x, x2: x, y1: y, y2: row - size }));
      place(x, bearing(f.azimuth_deg), { class: "foot" });
    });
    for (let a = Math.ceil((az - 100) / 5) * 5; a <= az + 100; a += 5) {
      const { x, y } = at(level, a);
      if (x < 0 || x > width) continue;
      const strong = a % 15 === 0;
      ring.push(svg("line", { class: "tick", x1: x, x2: x, y1: y, y2: y + size * (strong ? 0.45 : 0.25) }));
      const round = (a + 360) % 360;
      if (strong) place(x, round % 45 === 0 ? wind(round, 8) : bearing(round));
    }

    const staff = [];
    const step_px = at(0).y - at(10).y;
    const land = horizonAt(horizon, az);
    for (const el of crown ? STAFF : []) {
      const { x, y } = at(el);
      const close = Math.abs(y - (crown.y - size)) < size * 1.5;
      if (y < size || close || step_px < size * 1.1 || el < land + 5) continue;
      staff.push(svg("line", { class: "tick", x1: x - size * 0.35, x2: x + size * 0.35, y1: y, y2: y }));
      staff.push(text(x - size * 0.6, y + size * 0.35, words.sky.staff_degrees(el), { "text-anchor": "end" }));
      staff.push(text(x + size * 0.6, y + size * 0.35, words.sky.staff_fists(el)));
    }

    if (sun_up) this.drawAntisolar(marks, text, at(axis.elevation_deg), axis, { row, bottom });
    const lack = !sun_up ? [words.sky.sun_down] : crown ? [] : words.sky.hidden(below_deg);
    lack.forEach((line, i) => marks.push(text(width / 2, at(30).y + size * 1.6 * i, line, { class: "big", "text-anchor": "middle" })));
    this.staff.replaceChildren(...staff);
    this.ring.replaceChildren(...ring);
    this.marks.replaceChildren(...marks);
  }

  /** A cross where the antisolar point lies, its words beside it, both kept clear of the row of bearings. */
  drawAntisolar(marks, text, { x, y }, axis, { row, bottom }) {
    const { size, width } = this;
    const arm = size * 0.5;
    const shown = y < bottom - arm;
    const py = shown ? y : bottom - arm;
    marks.push(
      shown
        ? svg("path", { class: "cross", "data-mark": "antisolar", d: `M${x - arm} ${py}h${2 * arm}M${x} ${py - arm}v${2 * arm}` })
        : svg("path", { class: "cross", d: `M${x - arm} ${py - arm}l${arm} ${arm}l${arm} ${-arm}` }),
    );
    const [name, depth] = words.sky.antisolar(axis.elevation_deg);
    const line = Math.max(py + size * 0.35, row + size * 1.4);
    const left = x + size;
    const fits = (words) => textWidth(words, size) < width - left;
    const lines = fits(`${name}, ${depth}`) ? [`${name}, ${depth}`] : [name, depth].filter(fits);
    const first = Math.min(line, bottom - size * 0.5 - size * 1.2 * (lines.length - 1));
    lines.forEach((words, i) => marks.push(text(left, first + size * 1.2 * i, words)));
  }
}
