// The curve across the bow: luminance with the colours as a strip, degree of polarisation below, and what a filter does.
// Drawn only while it is open.

import { byId, el, set, setText, svg } from "./dom.js";
import { css, lightAt } from "./light.js";
import { arcLean } from "./sky.js";
import * as words from "./words.js";

const [FIRST, LAST, TICK] = [30, 60, 5];
/** Linear grey of the darkest place in the strip. */
const GREY = 0.13;
const STRIP_STOPS = 120;

/** The least of 1, 2, 2.5, 3, 4, 5, 6, 8, 10 times a power of ten that a value does not pass. */
function roundUp(value) {
  const power = 10 ** Math.floor(Math.log10(value));
  return [1, 2, 2.5, 3, 4, 5, 6, 8, 10].map((n) => n * power).find((n) => n >= value);
}

export class Curve {
  constructor() {
    this.details = byId("across");
    this.node = byId("curve");
    this.stops = Array.from({ length: STRIP_STOPS + 1 }, (_, i) => svg("stop", { offset: i / STRIP_STOPS }));
    this.strip = svg("rect", { fill: "url(#strip)", class: "strip" });
    this.lines = { bright: svg("path", { class: "curve-line" }), polar: svg("path", { class: "curve-line" }) };
    this.frame = svg("g");
    this.title = svg("title", { id: "curve-describe" });
    set(this.node, { "aria-labelledby": "curve-describe" });
    this.node.append(this.title, svg("defs", {}, svg("linearGradient", { id: "strip" }, ...this.stops)), this.strip, this.frame, ...Object.values(this.lines));
    this.details.addEventListener("toggle", () => this.draw());
    new ResizeObserver(() => this.draw()).observe(this.node);
  }

  /** Takes the step looked at; `feet` are the directions where the arc meets the horizon. */
  show(step, feet) {
    Object.assign(this, { step, feet });
    this.draw();
  }

  draw() {
    if (!this.details.open || !this.step) return;
    const { sun, prominence } = this.step;
    const up = sun.elevation_deg > 0;
    const light = up ? lightAt(sun.elevation_deg) : null;
    this.node.parentElement.hidden = !light;
    setText(byId("across-say"), light ? words.light.expect(prominence ?? light.bows[0].contrast, sun.elevation_deg, prominence !== null) : up ? words.light.waiting : words.light.sun_down);
    const facts = light ? words.light.facts(light) : [];
    byId("across-facts").replaceChildren(...facts.map(([name, text]) => el("div", {}, el("dt", {}, name), el("dd", {}, text))));
    const leans = this.feet.map((foot) => foot && arcLean(this.step.antisolar_point, foot));
    const filter = light && this.step.crown ? words.light.polariser(light.polariser, leans) : [];
    byId("filter").replaceChildren(...filter.map((text) => el("li", {}, text)));
    byId("filter-title").hidden = filter.length === 0;
    if (light) this.drawCurve(light);
  }

  drawCurve(light) {
    const { width } = this.node.getBoundingClientRect();
    const size = parseFloat(getComputedStyle(this.node).fontSize);
    const wide = width > size * 24;
    const rows = { top: size * 3, bright: size * 9, strip: size * 1.6, gap: size * 1.8, polar: size * 5, foot: size * 1.6 };
    const floor = rows.top + rows.bright;
    const polar_top = floor + rows.strip + rows.gap;
    const polar_floor = polar_top + rows.polar;
    const height = polar_floor + rows.foot;
    set(this.node, { viewBox: `0 0 ${width} ${height}`, height });
    const x = (angle_deg) => ((angle_deg - FIRST) / (LAST - FIRST)) * width;
    const most = roundUp(Math.max(...light.luminance_cd_m2));
    const line = (values, y) => `M${values.map((value, i) => `${x(light.angle_deg[i]).toFixed(1)} ${y(value).toFixed(1)}`).filter((_, i) => i % 2 === 0).join("L")}`;
    set(this.lines.bright, { d: line(light.luminance_cd_m2, (value) => floor - (value / most) * rows.bright) });
    set(this.lines.polar, { d: line(light.degree_of_polarisation, (value) => polar_floor - Math.max(0, value) * rows.polar) });
    set(this.strip, { y: floor, width, height: rows.strip });
    this.stops.forEach((stop, i) => set(stop, { "stop-color": css(light.linear[(i * (light.linear.length - 1)) / STRIP_STOPS], GREY) }));

    const text = (at_x, y, content, anchor = "start") => svg("text", { x: at_x.toFixed(1), y: y.toFixed(1), "text-anchor": anchor }, content);
    const rule = (y) => svg("line", { class: "curve-rule", x1: 0, x2: width, y1: y, y2: y });
    const frame = [rule(rows.top), rule(floor), rule(polar_top), rule(polar_floor)];
    frame.push(text(0, size, words.light.luminance(most)), text(0, polar_top - size * 0.4, words.light.polarised));
    const tick = wide ? TICK : 2 * TICK;
    for (let a = FIRST + tick; a < LAST; a += tick) {
      frame.push(svg("line", { class: "curve-rule", x1: x(a), x2: x(a), y1: polar_floor, y2: polar_floor + size * 0.3 }));
      frame.push(text(x(a), polar_floor + size * 1.3, words.light.angle(a), "middle"));
    }
    light.bows.forEach((bow, i) => {
      const mark = (angle_deg, kind) => svg("line", { class: kind, x1: x(angle_deg), x2: x(angle_deg), y1: rows.top, y2: floor });
      frame.push(mark(bow.radius_deg, "curve-ray"));
      if (bow.brightest_deg !== null) frame.push(mark(bow.brightest_deg, "curve-brightest"));
      frame.push(text(x(bow.radius_deg), rows.top - size * 0.4, wide ? words.light.names[i] : words.light.short[i], "middle"));
    });
    this.frame.replaceChildren(...frame);
    setText(this.title, words.light.describe(light));
  }
}
