// Takes pictures of the page in many states, to be looked at: node look.mjs [folder]
import { mkdir } from "node:fs/promises";
import { openPage, closeAll, scrubTo, waitForOutlook, outlookOf } from "./browser.mjs";

const folder = process.argv[2] ?? "artifacts";
await mkdir(folder, { recursive: true });
const SIZES = { phone: { width: 360, height: 740 }, desk: { width: 1280, height: 800 } };
const MOMENTS = {
  now: () => true,
  best: (s, o) => o.windows.length && s.time === o.windows[0].best.time,
  low: (s) => s.sun.elevation_deg > 1 && s.sun.elevation_deg < 3,
  high: (s) => s.sun.elevation_deg > 44,
  middle: (s) => s.sun.elevation_deg > 33 && s.sun.elevation_deg < 36,
  night: (s) => s.sun.elevation_deg < -8,
};
for (const [size, viewport] of Object.entries(SIZES)) {
  for (const scheme of ["light", "dark"]) {
    for (const site of ["north-quay", "ewe-hollow"]) {
      const { page } = await openPage({ viewport, scheme, path: `?site=${site}` });
      await waitForOutlook(page);
      const outlook = await outlookOf(page);
      for (const [name, test] of Object.entries(MOMENTS)) {
        if (site === "ewe-hollow" && !["best", "low"].includes(name)) continue;
        if (scheme === "dark" && name === "middle") continue;
        const i = outlook.steps.findIndex((s) => test(s, outlook));
        if (i < 0) continue;
        if (name !== "now") await scrubTo(page, i);
        await page.screenshot({ path: `${folder}/${size}-${scheme}-${site}-${name}.png` });
      }
      await page.screenshot({ path: `${folder}/${size}-${scheme}-${site}-full.png`, fullPage: true });
      await page.click("#key-place");
      await page.screenshot({ path: `${folder}/${size}-${scheme}-${site}-place.png` });
      await page.context().close();
    }
  }
}
for (const [name, viewport] of Object.entries(SIZES)) {
  const { page } = await openPage({ viewport, scheme: "light", path: "?site=north-quay", largeText: true });
  await waitForOutlook(page);
  await page.screenshot({ path: `${folder}/${name}-large-text.png`, fullPage: true });
}
await closeAll();
