// The tape of time: the chance of every step, drawn once, moved under a fixed needle by a finger.
// A native range input lies over it for keyboards and screen readers.

import { set, svg } from "./dom.js";
import { dayName, hhmm } from "./format.js";
import { time } from "./words.js";

const HOUR = 3600e3;
const NEEDLE = 0.3;
const TAP_PX = 6;

export class Timeline {
  /** `onMove(index)` is called for every step that comes under the needle by hand. */
  constructor(root, drawing, input, onMove) {
    Object.assign(this, { root, drawing, input, onMove, steps: [], index: 0 });
    this.tape = svg("g");
    this.needle = svg("path", { class: "needle" });
    drawing.append(this.tape, this.needle);
    input.addEventListener("input", () => this.move(Number(input.value)));
    input.addEventListener("keydown", (event) => this.onKey(event));
    root.addEventListener("pointerdown", (event) => this.grab(event));
    root.addEventListener("pointermove", (event) => this.drag(event));
    for (const end of ["pointerup", "pointercancel"]) root.addEventListener(end, (event) => this.release(event));
  }

  /** Takes a new outlook: parallel `times` in ms, its steps and windows. */
  load({ steps, windows, times, now }) {
    Object.assign(this, { steps, windows, times, now });
    set(this.input, { max: steps.length - 1 });
    this.input.disabled = steps.length === 0;
    this.paint();
  }

  /** Pixels per millisecond and the x of a time on the tape. */
  x(ms) {
    return (ms - this.times[0]) * this.rate;
  }

  paint() {
    const { width, height } = this.root.getBoundingClientRect();
    const size = parseFloat(getComputedStyle(this.drawing).fontSize);
    set(this.drawing, { viewBox: `0 0 ${width} ${height}`, width, height });
    this.needleX = Math.round(width * NEEDLE);
    const foot = height - size * 1.7;
    set(this.needle, { d: `M${this.needleX} 0v${foot}m${-size * 0.5} ${-foot}h${size}l${-size * 0.5} ${size * 0.6}z` });
    if (this.steps.length === 0) return;
    const hours = (this.times.at(-1) - this.times[0]) / HOUR;
    this.rate = Math.max(size * 1.8, (width * 0.65) / hours) / HOUR;
    const head = size * 1.1;
    const end = this.x(this.times.at(-1));
    const nodes = [svg("rect", { class: "tape-day", x: 0, y: 0, width: end, height: foot })];
    nodes.push(...this.runs((step) => step.sun.elevation_deg < 0).map(([a, b]) => svg("rect", { class: "tape-night", x: a, y: 0, width: b - a, height: foot })));
    nodes.push(...this.runs((step) => step.chance === null && step.sun.elevation_deg >= 0).map(([a, b]) => svg("rect", { class: "tape-unknown", x: a, y: foot - size, width: b - a, height: size })));
    let path = `M0 ${foot}`;
    this.steps.forEach((step, i) => {
      path += `L${this.x(this.times[i]).toFixed(1)} ${(foot - (foot - head) * (step.chance ?? 0)).toFixed(1)}`;
    });
    nodes.push(svg("path", { class: "tape-chance", d: `${path}L${end} ${foot}z` }));
    for (const w of this.windows) {
      const [a, b] = [this.x(Date.parse(w.start)), this.x(Date.parse(w.end))];
      nodes.push(svg("rect", { class: "tape-window", x: a, y: 0, width: Math.max(b - a, 3), height: size * 0.45 }));
    }
    nodes.push(...this.marks(foot, height, size));
    this.tape.replaceChildren(...nodes);
    this.show(this.index);
  }

  /** Hours below the tape, every third named, the day's name at midnight; and where now is. */
  marks(foot, height, size) {
    const nodes = [];
    const hour = new Date(this.times[0]);
    hour.setMinutes(0, 0, 0);
    for (hour.setHours(hour.getHours() + 1); hour.getTime() <= this.times.at(-1); hour.setHours(hour.getHours() + 1)) {
      const x = this.x(hour.getTime()).toFixed(1);
      const named = hour.getHours() % 3 === 0;
      nodes.push(svg("line", { class: "tape-tick", x1: x, x2: x, y1: foot, y2: foot + size * (named ? 0.4 : 0.2) }));
      if (!named) continue;
      const midnight = hour.getHours() === 0;
      nodes.push(svg("text", { x, y: height - size * 0.25, class: midnight ? "day" : "hour", "text-anchor": "middle" }, midnight ? dayName(hour) : hhmm(hour)));
    }
    const now = this.x(this.now).toFixed(1);
    nodes.push(svg("line", { class: "tape-now", x1: now, x2: now, y1: 0, y2: foot }), svg("text", { x: Number(now) - size * 0.35, y: foot - size * 0.4, "text-anchor": "end", class: "day" }, time.now));
    return nodes;
  }

  /** Stretches of the tape, in pixels, over which a test of the step holds. */
  runs(test) {
    const runs = [];
    this.steps.forEach((step, i) => {
      if (!test(step)) return;
      const a = this.x(this.times[i]);
      const b = this.x(this.times[Math.min(i + 1, this.times.length - 1)]);
      if (runs.length && runs.at(-1)[1] === a) runs.at(-1)[1] = b;
      else runs.push([a, b]);
    });
    return runs;
  }

  /** Brings a step under the needle. */
  show(index, spoken) {
    this.index = index;
    if (this.steps.length === 0) return;
    set(this.tape, { transform: `translate(${(this.needleX - this.x(this.times[index])).toFixed(1)} 0)` });
    this.input.value = index;
    if (spoken) set(this.input, { "aria-valuetext": spoken });
  }

  move(index) {
    const inside = Math.min(this.steps.length - 1, Math.max(0, index));
    if (inside !== this.index) this.onMove(inside);
  }

  /** The step nearest to a time. */
  nearest(ms) {
    let best = 0;
    this.times.forEach((t, i) => {
      if (Math.abs(t - ms) < Math.abs(this.times[best] - ms)) best = i;
    });
    return best;
  }

  onKey(event) {
    const hour = this.nearest(this.times?.[this.index] + HOUR) - this.index || 12;
    const by = { PageUp: hour, PageDown: -hour }[event.key];
    if (by === undefined || this.steps.length === 0) return;
    event.preventDefault();
    this.move(this.index + by);
  }

  grab(event) {
    if (this.steps.length === 0 || event.button !== 0) return;
    this.held = { id: event.pointerId, x: event.clientX, from: this.times[this.index], moved: false };
    this.root.setPointerCapture(event.pointerId);
  }

  drag(event) {
    if (this.held?.id !== event.pointerId) return;
    const dx = event.clientX - this.held.x;
    this.held.moved ||= Math.abs(dx) > TAP_PX;
    if (this.held.moved) this.move(this.nearest(this.held.from - dx / this.rate));
  }

  release(event) {
    if (this.held?.id !== event.pointerId) return;
    const tapped = event.type === "pointerup" && !this.held.moved;
    this.held = null;
    if (!tapped) return;
    const x = event.clientX - this.root.getBoundingClientRect().left;
    this.move(this.nearest(this.times[this.index] + (x - this.needleX) / this.rate));
    this.input.focus({ preventScroll: true });
  }
}
