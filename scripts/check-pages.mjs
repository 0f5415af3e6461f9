// Opens report pages in headless Chromium and checks what a reader relies on; a tool of development, no part of the program.
//
//     npm install --no-save --no-package-lock --prefix FOLDER puppeteer-core@24.43.1 axe-core@4.14.1
//     NODE_PATH=FOLDER/node_modules CHROMIUM=/usr/bin/chromium node scripts/check-pages.mjs OUT report.html …
//
// Of every page: no script error, no request to anywhere; names, roles and contrast by axe-core (WCAG 2.2 A and AA) in light
// and dark; nothing wider than the window at 1280 and 400 pixels; the slider by keyboard and by pointer; complete without
// scripts; printed on A4 with no picture cut. Screenshots and the print go to OUT. Ends with 1 if a check fails.

import { createRequire } from "node:module";
import fs from "node:fs";
import path from "node:path";
import { pathToFileURL } from "node:url";

const require = createRequire(path.join(process.env.NODE_PATH, "here.js"));
const puppeteer = require("puppeteer-core");
const axe = require.resolve("axe-core/axe.min.js");

const [out, ...pages] = process.argv.slice(2);
if (!out || pages.length === 0) {
  console.error("usage: check-pages.mjs OUT report.html …");
  process.exit(2);
}
fs.mkdirSync(out, { recursive: true });

// A4 less the margins of the page's own style, in CSS pixels
const PAPER = { width: 210 / 25.4 * 96, height: 297 / 25.4 * 96 };
let failed = 0;
let passed = 0;

function check(page, what, good, more = "") {
  if (good) {
    passed += 1;
  } else {
    failed += 1;
    console.log(`FAILED ${page}: ${what}${more ? `: ${more}` : ""}`);
  }
}

async function accessible(tab, name, scheme) {
  await tab.emulateMediaFeatures([{ name: "prefers-color-scheme", value: scheme }]);
  const found = await tab.evaluate(async () => {
    const tags = ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa", "best-practice"];
    const result = await window.axe.run(document, { runOnly: { type: "tag", values: tags } });
    return {
      checks: result.passes.length,
      faults: result.violations.map((it) => `${it.id} (${it.nodes.length}): ${it.nodes[0].html.slice(0, 160)} ${it.nodes[0].failureSummary}`),
    };
  });
  check(name, `${scheme}: at least 20 kinds of checks ran`, found.checks >= 20, String(found.checks));
  check(name, `${scheme}: accessible`, found.faults.length === 0, found.faults.join("\n  "));
}

async function wide(tab, name, width) {
  await tab.setViewport({ width, height: 900 });
  const over = await tab.evaluate(() => document.scrollingElement.scrollWidth - document.scrollingElement.clientWidth);
  check(name, `nothing wider than ${width} pixels`, over <= 0, `${over} pixels over`);
}

const told = (tab) => tab.$eval("#slider-time", (it) => it.textContent);

async function slider(tab, name) {
  const count = await tab.$eval("#slider", (it) => Number(it.max));
  check(name, "the slider has instants", count > 0);
  check(name, "the slider is shown", await tab.$eval("#slider", (it) => it.checkVisibility()));
  check(name, "every net has a row", (await tab.$$("#values tbody tr")).length > 0);
  if (count === 0) return;
  const begin = () => tab.$eval("#slider", (it) => { it.value = it.min; it.dispatchEvent(new Event("input")); });
  await begin();
  const before = await told(tab);
  await tab.focus("#slider");
  await tab.keyboard.press("ArrowRight");
  const after = await told(tab);
  check(name, "an arrow key goes to the next instant", before !== after, `${before} / ${after}`);
  await tab.keyboard.press("ArrowLeft");
  check(name, "and back", (await told(tab)) === before);
  await tab.keyboard.press("End");
  const last = await told(tab);
  check(name, "End goes to the last", last.includes(`instant ${count + 1} of ${count + 1}`), last);
  await begin();
  const box = await (await tab.$("#slider")).boundingBox();
  await tab.mouse.click(box.x + box.width - 4, box.y + box.height / 2);
  check(name, "a click on the slider moves it", (await told(tab)) !== before, await told(tab));
  await begin();
  await tab.click("#slider-on");
  check(name, "the button goes to the next instant", (await told(tab)) === after, await told(tab));
  // every run can be chosen, and its values, line and text follow
  for (const run of await tab.$$eval("#slider-run option", (all) => all.map((it) => it.value))) {
    await tab.select("#slider-run", run);
    const last = await tab.$eval("#slider", (it) => { it.value = it.max; it.dispatchEvent(new Event("input")); return it.max; });
    check(name, `run ${run} can be stepped to its end`, (await told(tab)).includes(`of ${Number(last) + 1}`));
  }
}

async function printed(tab, name, file) {
  await tab.emulateMediaFeatures([{ name: "prefers-color-scheme", value: "light" }]);
  await tab.emulateMediaType("print");
  await tab.setViewport({ width: Math.floor(PAPER.width) - 100, height: 1000 });
  const pictures = await tab.evaluate(() => [...document.querySelectorAll("figure svg, figure img")].map((it) => {
    const { width, height } = it.getBoundingClientRect();
    const figure = it.closest("figure");
    return { width, height, kept: getComputedStyle(figure).breakInside, clipped: figure.scrollWidth - figure.clientWidth };
  }));
  check(name, "there are pictures", pictures.length > 0);
  for (const it of pictures) {
    const fits = it.width <= PAPER.width - 100 + 1 && it.height <= PAPER.height - 100 && it.kept === "avoid" && it.clipped <= 1;
    check(name, "a picture fits its sheet of paper", fits, JSON.stringify(it));
  }
  check(name, "the slider is not printed", !(await tab.$eval("#slider", (it) => it.checkVisibility())));
  await tab.pdf({ path: file, format: "A4", preferCSSPageSize: true });
  await tab.emulateMediaType(null);
}

const browser = await puppeteer.launch({
  executablePath: process.env.CHROMIUM || "/usr/bin/chromium",
  args: ["--no-sandbox", "--disable-gpu", "--disable-dev-shm-usage"],
});
for (const file of pages) {
  const name = path.basename(path.dirname(path.resolve(file))) || file;
  const url = pathToFileURL(path.resolve(file)).href;
  const tab = await browser.newPage();
  const errors = [];
  const requests = [];
  tab.on("pageerror", (error) => errors.push(error.message));
  tab.on("console", (message) => { if (["error", "warning"].includes(message.type())) errors.push(message.text()); });
  tab.on("request", (request) => { if (request.url().split("#")[0] !== url && !request.url().startsWith("data:")) requests.push(request.url()); });
  await tab.setViewport({ width: 1280, height: 900 });
  await tab.goto(url, { waitUntil: "load" });
  await slider(tab, name);
  await wide(tab, name, 400);
  await wide(tab, name, 1280);
  for (const scheme of ["light", "dark"]) {
    await tab.emulateMediaFeatures([{ name: "prefers-color-scheme", value: scheme }]);
    await tab.screenshot({ path: path.join(out, `${name}-${scheme}.png`), fullPage: true });
  }
  await printed(tab, name, path.join(out, `${name}.pdf`));
  check(name, "no script error", errors.length === 0, errors.join("; "));
  check(name, "no request", requests.length === 0, requests.join(" "));
  await tab.setViewport({ width: 1280, height: 900 });
  await tab.addScriptTag({ path: axe });
  await accessible(tab, name, "light");
  await accessible(tab, name, "dark");
  await tab.close();

  const plain = await browser.newPage();
  await plain.setJavaScriptEnabled(false);
  await plain.goto(url, { waitUntil: "load" });
  // the protocol can still look at the page
  const hidden = await plain.$eval("#slider", (it) => !it.checkVisibility());
  check(name, "without scripts there is no slider", hidden);
  const sections = await plain.$$eval("h2", (all) => all.filter((it) => it.checkVisibility()).length);
  check(name, "without scripts the page is complete", sections >= 8, `${sections} sections`);
  await plain.close();
}
await browser.close();
console.log(`${pages.length} pages: ${passed} passed, ${failed} failed`);
process.exit(failed === 0 ? 0 : 1);
