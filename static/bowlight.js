// The sky in the light of the hour: discs round the antisolar point, one within the other, each with a gradient from its neighbour's rim.

import { set, svg } from "./dom.js";
import { css } from "./light.js";

/** Rims of the discs from the antisolar point, degrees: close together where a bow stands, so that circles of the sky between them come out right. */
const RIMS = [30, 34, 38, 40, 42, 44, 47, 50, 52, 54, 57, 60];
/** Steps of colour, degrees: fine where the bows are. */
const step = (rim) => ((rim >= 38 && rim < 44) || (rim >= 50 && rim < 54) ? 0.2 : 0.5);
/** Linear grey that the sky between the bows is exposed to: as a meter would on a dark cloud. */
const GREY = 0.13;

const indexOf = (angle_deg) => Math.round((angle_deg - 30) / 0.05);

export class BowLight {
  constructor() {
    this.around = svg("rect");
    this.rings = RIMS.slice(1).map((to, i) => {
      const from = RIMS[i];
      const count = Math.round((to - from) / step(from));
      const shares = Array.from({ length: count + 1 }, (_, k) => k / count);
      const stops = shares.map(() => svg("stop"));
      const gradient = svg("radialGradient", { id: `ring-${from}`, gradientUnits: "userSpaceOnUse" }, ...stops);
      return { from, to, shares, stops, gradient, disc: svg("circle", { fill: `url(#ring-${from})` }) };
    });
    this.core = svg("circle");
    this.defs = this.rings.map((ring) => ring.gradient);
    this.node = svg("g", { class: "light" }, this.around, ...this.rings.map((ring) => ring.disc).reverse(), this.core);
  }

  measure(width, height) {
    set(this.around, { width, height });
  }

  /** Draws the light round an axis, the bow `strength` times as strong as computed; null hides it all. */
  draw(camera, axis, light, strength, opacity) {
    set(this.node, { opacity: light ? opacity : 0 });
    if (!light) return;
    const sky = light.linear[light.dark];
    const colour = (angle_deg) => css(light.linear[indexOf(angle_deg)].map((part, k) => sky[k] + strength * (part - sky[k])), GREY);
    set(this.around, { fill: colour(60) });
    for (const { from, to, shares, stops, gradient, disc } of this.rings) {
      const inner = camera.circle(axis, from);
      const outer = camera.circle(axis, to);
      // The circles between the two rims are those of a cone whose tip lies at the focus.
      const start = inner.r / outer.r;
      const tip = (a, b) => (a - start * b) / (1 - start);
      set(gradient, { cx: outer.cx, cy: outer.cy, r: outer.r, fx: tip(inner.cx, outer.cx), fy: tip(inner.cy, outer.cy) });
      set(disc, outer);
      shares.forEach((share, i) => set(stops[i], { offset: (start + (1 - start) * share).toFixed(5), "stop-color": colour(from + share * (to - from)) }));
    }
    set(this.core, { ...camera.circle(axis, 30), fill: colour(30) });
  }
}
