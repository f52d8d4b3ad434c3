// The geometry behind the drawing, without a browser.
import assert from "node:assert/strict";
import { readFile } from "node:fs/promises";
import { test } from "node:test";
import { plainNumber, fists, span, bearing } from "../../static/format.js";
import { fit, foot, horizonAt, onCircle, projection, radiusAt, separation, turn } from "../../static/sky.js";

const near = (a, b, within, what) => assert.ok(Math.abs(a - b) <= within, `${what ?? ""} ${a} is not within ${within} of ${b}`);

test("feet of the bow over a level and a lowered horizon agree with the closed form (tests/reference/bow_horizon.json)", async () => {
  const { rows } = JSON.parse(await readFile(new URL("../reference/bow_horizon.json", import.meta.url)));
  let feet = 0;
  for (const { inputs, expected } of rows) {
    const { bow_radius_deg, sun_elevation_deg, limit_elevation_deg } = inputs;
    if (bow_radius_deg === undefined || expected.foot_azimuth_offset_deg === undefined) continue;
    const axis = { azimuth_deg: 350, elevation_deg: -sun_elevation_deg };
    const found = [-1, 1].map((side) => foot(axis, bow_radius_deg, { dip_deg: -(limit_elevation_deg ?? 0), skyline: [] }, side));
    if (expected.foot_azimuth_offset_deg === null) {
      assert.deepEqual(found, [null, null], JSON.stringify(inputs));
      continue;
    }
    feet += 1;
    near(turn(350, found[0].azimuth_deg), -expected.foot_azimuth_offset_deg, 0.01, "left foot");
    near(turn(350, found[1].azimuth_deg), expected.foot_azimuth_offset_deg, 0.01, "right foot");
  }
  assert.ok(feet >= 10, `only ${feet} rows with feet`);
});

test("a foot on a skyline lies on the skyline, and the arc above it is clear", () => {
  const horizon = { dip_deg: 0, skyline: [[60, 4], [100, 12], [150, 1]] };
  const axis = { azimuth_deg: 110, elevation_deg: -12 };
  for (const side of [-1, 1]) {
    const f = foot(axis, 42.4, horizon, side);
    near(f.elevation_deg, horizonAt(horizon, f.azimuth_deg), 0.01);
    near(separation(f, axis), 42.4, 1e-9);
  }
  assert.equal(foot(axis, 42.4, { dip_deg: 0, skyline: [[0, 45], [180, 45]] }, 1), null);
});

test("the share of the circle over a skyline agrees with tests/reference/bow_horizon.json", async () => {
  const { rows } = JSON.parse(await readFile(new URL("../reference/bow_horizon.json", import.meta.url)));
  const skylines = rows.filter((row) => row.inputs.skyline);
  assert.ok(skylines.length >= 5);
  for (const { inputs, expected } of skylines) {
    const skyline = inputs.skyline.azimuth_deg.map((az, i) => [az, inputs.skyline.elevation_deg[i]]);
    const axis = { azimuth_deg: inputs.antisolar_azimuth_deg, elevation_deg: -inputs.sun_elevation_deg };
    let clear = 0;
    for (let i = 0; i < 7200; i += 1) {
      const d = onCircle(axis, inputs.bow_radius_deg, (i + 0.5) / 20);
      if (d.elevation_deg > horizonAt({ skyline }, d.azimuth_deg)) clear += 1;
    }
    near(clear / 7200, expected.visible_arc_fraction, 5e-4, JSON.stringify(inputs));
  }
});

test("the skyline is straight between its points, also through north", () => {
  const horizon = { skyline: [[10, 2], [350, 4]] };
  near(horizonAt(horizon, 0), 3, 1e-12);
  near(horizonAt(horizon, 180), 3, 1e-12);
  assert.equal(horizonAt({ skyline: [], dip_deg: 0.5 }, 90), -0.5);
  assert.equal(horizonAt({ skyline: [[200, 7]] }, 20), 7);
});

test("pixels and directions are one to one, and the level horizon is a straight line", () => {
  const p = projection({ azimuth_deg: 300, scale: 150, x0: 180, y0: 160 });
  for (let az = 210; az <= 390; az += 15) {
    for (let el = -60; el <= 75; el += 15) {
      const d = { azimuth_deg: az % 360, elevation_deg: el };
      near(separation(p.unproject(p.project(d)), d), 0, 1e-6, `${az} ${el}`);
    }
    near(p.project({ azimuth_deg: az, elevation_deg: 0 }).y, 160, 1e-9);
  }
  // Snyder (1987), stereographic of the sphere: a direction at angle c from the centre falls at 2 tan(c/2)
  near(p.project({ azimuth_deg: 300, elevation_deg: 40 }).y, 160 - 150 * 2 * Math.tan((20 * Math.PI) / 180), 1e-9);
  near(p.project({ azimuth_deg: 0, elevation_deg: 0 }).x, 180 + 150 * 2 * Math.tan(Math.PI / 6), 1e-9);
});

test("a bow is drawn as the very circle its directions fall on", () => {
  for (const [facing, azimuth_deg, elevation_deg, radius] of [[80, 80, -20, 42.39], [10, 350, 5, 53.7], [200, 200, -60, 40.5]]) {
    const p = projection({ azimuth_deg: facing, scale: 1000, x0: 0, y0: 0 });
    const axis = { azimuth_deg, elevation_deg };
    const { cx, cy, r } = p.circle(axis, radius);
    for (let a = 0; a < 360; a += 30) {
      const d = onCircle(axis, radius, a);
      near(separation(d, axis), radius, 1e-9);
      const { x, y } = p.project(d);
      near(Math.hypot(x - cx, y - cy), r, 1e-6);
    }
  }
});

test("the frame holds the whole scene at a low Sun, on a phone and on a desk", () => {
  for (const [w, h] of [[360, 310], [848, 560], [320, 250]]) {
    const p = fit(0, w, h);
    for (const side of [-1, 1]) {
      const { x, y } = p.project({ azimuth_deg: (360 + side * 53.7) % 360, elevation_deg: 0 });
      assert.ok(x > 0 && x < w && y > 0 && y < h);
    }
    assert.ok(p.project({ azimuth_deg: 0, elevation_deg: 53.7 }).y > 0);
    assert.ok(p.project({ azimuth_deg: 0, elevation_deg: -42 }).y < h);
  }
});

test("the radius runs through the three given radii", () => {
  const radii = { red: 42.39, green: 41.78, violet: 40.52 };
  near(radiusAt(radii, 700), 42.39, 1e-9);
  near(radiusAt(radii, 550), 41.78, 1e-9);
  near(radiusAt(radii, 400), 40.52, 1e-9);
  for (let nm = 401; nm <= 700; nm += 1) assert.ok(radiusAt(radii, nm) > radiusAt(radii, nm - 1));
});

test("coordinates as people type them", () => {
  for (const [typed, plain] of [["60.2", "60.2"], [" 60,2 ", "60.2"], ["4.1 W", "-4.1"], ["−4.1", "-4.1"], ["-4.1°", "-4.1"], ["33 S", "-33"], ["north", "north"], ["", ""], ["1.2.3", "1.2.3"]]) assert.equal(plainNumber(typed), plain);
});

test("figures read well", () => {
  assert.deepEqual([4, 24, 40, 2].map(fists), ["½", "2½", "4", "0"]);
  assert.deepEqual([59, 60, 200, 1200, 3000].map((m) => span(m * 60e3)), ["59 min", "1 h", "3 h 20 min", "20 h", "2 days"]);
  assert.equal(bearing(359.7), "0°");
});
