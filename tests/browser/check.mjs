// Opens a page in a real browser and checks what a reader relies on.
//
//   node check.mjs PAGE.html FIGURES_FOLDER [SCREENSHOTS_FOLDER]
//
// Exit code 0 when every check holds; otherwise each failure on a line.

import { readFileSync, readdirSync, mkdirSync } from "node:fs";
import { createRequire } from "node:module";
import { join, resolve } from "node:path";
import { pathToFileURL } from "node:url";
import { chromium } from "playwright-core";
import * as vega from "vega";
import { compile } from "vega-lite";

const [pagePath, figuresPath, shotsPath] = process.argv.slice(2);
if (!pagePath || !figuresPath) {
  console.error("usage: node check.mjs PAGE.html FIGURES_FOLDER [SCREENSHOTS_FOLDER]");
  process.exit(2);
}
const address = pathToFileURL(resolve(pagePath)).href;
const axe = readFileSync(createRequire(import.meta.url).resolve("axe-core/axe.min.js"), "utf8");
const failures = [];
const check = (holds, words) => {
  if (!holds) failures.push(words);
};

const browser = await chromium.launch({
  executablePath: process.env.CHROMIUM ?? "/usr/bin/chromium",
  args: ["--no-sandbox", "--disable-gpu", "--disable-quic", "--disable-background-networking",
    "--disable-component-update", "--disable-sync", "--no-first-run"],
});

// Words of a drawing that reach beyond its edge, and anything wider than the window that does not
// stand in a part that scrolls.
const overflows = () => {
  const found = [];
  const edge = document.documentElement.clientWidth;
  if (document.documentElement.scrollWidth > edge) {
    found.push(`the page is ${document.documentElement.scrollWidth} wide in a window of ${edge}`);
  }
  for (const svg of document.querySelectorAll("svg.figure")) {
    const frame = svg.getBoundingClientRect();
    if (frame.width === 0) continue;
    for (const text of svg.querySelectorAll("text")) {
      const box = text.getBoundingClientRect();
      if (box.left < frame.left - 1 || box.right > frame.right + 1 ||
          box.top < frame.top - 1 || box.bottom > frame.bottom + 1) {
        found.push(`"${text.textContent}" leaves the drawing ${svg.getAttribute("aria-label").slice(0, 40)}`);
      }
    }
  }
  const scrolls = (node) => node.closest(".scroll") !== null || node.closest("svg") !== null;
  for (const node of document.querySelectorAll("p,li,h1,h2,h3,h4,figcaption,summary,pre,a")) {
    const box = node.getBoundingClientRect();
    if (box.width > 0 && !scrolls(node) && box.right > edge + 1 && !node.matches(".skip")) {
      found.push(`<${node.localName}> "${node.textContent.slice(0, 40)}" leaves the window`);
    }
  }
  return found;
};

for (const width of [360, 1400]) {
  for (const scheme of ["light", "dark"]) {
    const where = `${width} px, ${scheme}`;
    const context = await browser.newContext({
      viewport: { width, height: 900 },
      colorScheme: scheme,
      deviceScaleFactor: 1,
    });
    const page = await context.newPage();
    page.on("console", (m) => ["error", "warning"].includes(m.type()) && failures.push(`${where}: console: ${m.text()}`));
    page.on("pageerror", (e) => failures.push(`${where}: script: ${e.message}`));
    page.on("request", (r) => check(r.url() === address || r.url().startsWith("data:"), `${where}: request of ${r.url()}`));
    await page.goto(address);

    check((await page.locator("figure").count()) >= 4, `${where}: fewer than four figures`);
    check((await page.locator("svg.figure").count()) >= 4, `${where}: fewer than four drawings`);
    for (const label of await page.locator("svg.figure").evaluateAll((all) => all.map((s) => s.getAttribute("aria-label")))) {
      check(label && label.length > 10, `${where}: a drawing without words for it`);
    }
    check((await page.locator(".answer .said").count()) >= 1, `${where}: no answer`);
    for (const words of await page.evaluate(overflows)) failures.push(`${where}: ${words}`);
    await page.evaluate(axe);
    const found = await page.evaluate(() => axe.run(document, { resultTypes: ["violations"] }));
    for (const v of found.violations) {
      const nodes = v.nodes.slice(0, 3).map((n) => `${n.target} ${n.failureSummary}`);
      failures.push(`${where}: axe ${v.id} (${v.impact}): ${nodes.join(" | ")}`);
    }
    if (shotsPath) {
      mkdirSync(shotsPath, { recursive: true });
      await page.screenshot({ path: join(shotsPath, `${width}-${scheme}.png`), fullPage: true });
    }
    await context.close();
  }
}

// Sorting, filtering and the page without script.
{
  const context = await browser.newContext({ viewport: { width: 1400, height: 900 } });
  const page = await context.newPage();
  await page.goto(address);
  await page.locator("#figure-diversity details summary").click();
  const head = page.locator("#data-diversity thead th").nth(2);
  const column = () => page.locator("#data-diversity tbody tr td:nth-child(3)").allTextContents();
  await head.locator("button").click();
  const up = (await column()).map(Number);
  check(up.every((x, i) => i === 0 || up[i - 1] <= x), `sorting upwards: ${up}`);
  check((await head.getAttribute("aria-sort")) === "ascending", "no word of the order");
  await head.locator("button").click();
  const down = (await column()).map(Number);
  check(down.every((x, i) => i === 0 || down[i - 1] >= x), `sorting downwards: ${down}`);
  const pdf = await page.pdf({ format: "A4" });
  check(pdf.subarray(0, 5).toString() === "%PDF-" && pdf.length > 20_000, "no print");
  const { writeFileSync } = await import("node:fs");
  if (shotsPath) writeFileSync(join(shotsPath, "print.pdf"), pdf);
  await context.close();

  const bare = await browser.newContext({ javaScriptEnabled: false });
  const still = await bare.newPage();
  await still.goto(address);
  check((await still.locator("table tbody tr").count()) > 5, "without script: no rows");
  check((await still.locator("button,input").count()) === 0, "without script: controls that do nothing");
  await bare.close();
}

// Each figure as a file: it opens by itself, and its specification draws the same data.
for (const name of readdirSync(figuresPath).sort()) {
  const path = join(figuresPath, name);
  if (name.endsWith(".svg")) {
    const page = await browser.newPage();
    await page.goto(pathToFileURL(resolve(path)).href);
    check((await page.locator("text").count()) > 3, `${name}: no words`);
    check((await page.locator("parsererror").count()) === 0, `${name}: no XML`);
    if (shotsPath) await page.screenshot({ path: join(shotsPath, `${name}.png`) });
    await page.close();
  } else if (name.endsWith(".vl.json")) {
    // Layers of independent facets share their axis: that is meant.
    const told = [];
    const logger = { level: () => logger, error: (m) => told.push(m), warn: (m) => told.push(m), info: () => logger, debug: () => logger };
    try {
      const drawing = compile(JSON.parse(readFileSync(path, "utf8")), { logger }).spec;
      const view = new vega.View(vega.parse(drawing), { renderer: "none" });
      const svg = await view.toSVG();
      check(svg.includes("<path"), `${name}: draws nothing`);
      if (shotsPath) { const { writeFileSync } = await import("node:fs"); writeFileSync(join(shotsPath, `${name}.svg`), svg); }
    } catch (e) {
      failures.push(`${name}: ${e.message}`);
    }
    for (const m of new Set(told.filter((t) => !t.startsWith("Detected faceted independent scales")))) failures.push(`${name}: ${m}`);
  }
}
await browser.close();

if (failures.length > 0) {
  console.error(failures.map((f) => `page check: ${f}`).join("\n"));
  process.exit(1);
}
console.log("page checks: all hold");
