// Takes the pictures of Now: node scripts/pictures.mjs [BASE_URL TOKEN] [--out DIR] [--path PATH --name NAME] [--points N]
// Without an address it starts the practice bench.
import { mkdir } from "node:fs/promises";
import { join } from "node:path";
import { fileURLToPath } from "node:url";
import { parseArgs } from "node:util";
import { aDaemon, openBrowser } from "./browser.mjs";

const { values: opt, positionals } = parseArgs({
  allowPositionals: true,
  options: { out: { type: "string" }, path: { type: "string", default: "/" }, name: { type: "string", default: "now" }, points: { type: "string", default: "30" } },
});
if (positionals[0]) [process.env.BASE_URL, process.env.TOKEN] = positionals;
const out = opt.out ?? fileURLToPath(new URL("../pictures", import.meta.url));
await mkdir(out, { recursive: true });

const daemon = await aDaemon();
const browser = await openBrowser();
try {
  for (const [width, height] of [[1440, 900], [390, 844]])
    for (const colorScheme of ["light", "dark"]) {
      const page = await browser.newPage({ viewport: { width, height }, colorScheme });
      const trouble = [];
      page.on("pageerror", (e) => trouble.push(e.message));
      page.on("console", (m) => m.type() === "error" && trouble.push(m.text()));
      await page.goto(`${daemon.base}${opt.path}#token=${daemon.token}`);
      await page.waitForSelector("h1");
      if (opt.path === "/") await page.waitForFunction((n) => document.querySelectorAll("main figure .dots circle").length >= n, Number(opt.points), { timeout: 120_000 });
      if (opt.path.startsWith("/boards")) await page.waitForSelector("main svg.staff", { timeout: 60_000 }); // a thousand boards are computed first
      await page.waitForTimeout(1_500); // the newest record comes after the points
      // Stretched to the whole page, so that a bar at the foot of the window is at the foot of the picture.
      await page.setViewportSize({ width, height: Math.max(height, await page.evaluate(() => document.documentElement.scrollHeight)) });
      const file = join(out, `${opt.name}-${width}-${colorScheme}.png`);
      await page.screenshot({ path: file, fullPage: true });
      console.log(file);
      if (trouble.length) throw new Error(`the page complained: ${trouble.join("; ")}`);
      await page.close();
    }
} finally {
  await browser.close();
  await daemon.close();
}
