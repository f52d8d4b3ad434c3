// What must hold in every state of the page.
import assert from "node:assert/strict";
import { readFile } from "node:fs/promises";
import { createRequire } from "node:module";

const axeSource = await readFile(createRequire(import.meta.url).resolve("axe-core/axe.min.js"), "utf8");

/** No sideways scroll, no cut text, no small target, no rule of axe-core broken, nothing on the console. */
export async function checkSound(page, errors, state) {
  const found = await page.evaluate(() => {
    const seen = (node) => node.checkVisibility({ visibilityProperty: true, opacityProperty: false });
    const name = (node) => `${node.tagName.toLowerCase()}#${node.id}.${node.className}: ${node.textContent.trim().slice(0, 40)}`;
    const wide = document.documentElement.scrollWidth - innerWidth;
    const texts = [...document.querySelectorAll("p, li, dd, dt, h1, h2, h3, span, button, label, summary")].filter(seen);
    const cut = texts.filter((n) => n.scrollWidth > n.clientWidth + 1 && getComputedStyle(n).display !== "inline").map(name);
    const small = [...document.querySelectorAll("button, input, summary, a[href]")].filter(seen).filter((n) => {
      const { width, height } = n.getBoundingClientRect();
      return width < 44 || height < 44;
    }).map(name);
    return { wide, cut, small };
  });
  assert.deepEqual(found, { wide: found.wide > 0 ? 0 : found.wide, cut: [], small: [] }, state);
  await page.evaluate(axeSource);
  const { violations } = await page.evaluate(() => window.axe.run(document, { resultTypes: ["violations"] }));
  assert.deepEqual(violations.map((v) => `${v.id}: ${v.nodes.map((n) => n.target).join(", ")}`), [], state);
  assert.deepEqual(errors, [], state);
}

/** No two texts of the sky or the tape overlap, and none of the sky leaves the drawing. */
export async function checkDrawing(page, state) {
  const found = await page.evaluate(() => {
    const out = [];
    for (const id of ["sky", "tape-drawing"]) {
      const frame = document.getElementById(id).getBoundingClientRect();
      const texts = [...document.querySelectorAll(`#${id} text`)].map((n) => {
        const b = n.getBoundingClientRect();
        return { text: n.textContent, left: b.left, right: b.right, top: b.top + b.height * 0.2, bottom: b.bottom - b.height * 0.2 };
      });
      texts.forEach((a, i) => {
        if (id === "sky" && (a.left < frame.left - 1 || a.right > frame.right + 1 || a.top < frame.top || a.bottom > frame.bottom)) out.push(`${a.text} leaves the drawing`);
        for (const b of texts.slice(i + 1)) if (a.left < b.right && b.left < a.right && a.top < b.bottom && b.top < a.bottom) out.push(`${a.text} over ${b.text}`);
      });
    }
    return out;
  });
  assert.deepEqual(found, [], state);
}

/** Takes the noise of a failed request off the console errors: the browser writes one for each. */
export const withoutRequests = (errors) => errors.filter((e) => !e.startsWith("Failed to load resource"));

/** Changes the service's JSON answer to a path on its way to the page. */
export const alter = (page, path, change) =>
  page.route(`**/v1/${path}*`, async (route) => {
    const response = await route.fetch();
    const body = await response.json();
    await route.fulfill({ response, json: change(body) ?? body });
  });
