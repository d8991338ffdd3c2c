// Keeps a window open until the probe has written what it saw, and holds that against what it should be.
import assert from "node:assert/strict";
import fs from "node:fs";
import { createRequire } from "node:module";
import path from "node:path";

const [port, seenPath, tools, picture] = process.argv.slice(2);
const { chromium } = createRequire(path.join(tools, "package.json"))("playwright-core");

const sleep = (time) => new Promise((resolve) => setTimeout(resolve, time));

async function until(what, condition) {
  for (let attempt = 0; attempt < 600; attempt++) {
    if (await condition()) {
      return;
    }
    await sleep(200);
  }
  throw new Error(`waited in vain for ${what}`);
}

const address = `http://127.0.0.1:${port}`;
await until("the editor", () => fetch(`${address}/healthz`).then((reply) => reply.ok, () => false));
/// What the panel shows, asked of its innermost frame.
async function shown(page) {
  for (const frame of page.frames()) {
    const found = await frame
      .evaluate(() => {
        const picture = document.getElementById("picture");
        const svg = picture?.querySelector("svg");
        const count = (wanted) => svg.querySelectorAll(wanted).length;
        return svg && {
          dispersion: count("path.dispersion"),
          bands: count("g.band"),
          potential: count("path.potential"),
          texts: [...svg.querySelectorAll("text")].map((text) => text.textContent.trim()),
          stale: picture.classList.contains("stale"),
          trouble: document.getElementById("trouble").textContent,
        };
      })
      .catch(() => null);
    if (found) {
      return found;
    }
  }
  return null;
}

/// Waits for the probe's step, then for what is asked of the page to be as wanted, and tells the probe.
async function look(page, step, wanted, ask = shown) {
  await until(`the probe's step ${step}`, () => {
    const failed = fs.existsSync(seenPath) ? fs.readFileSync(seenPath, "utf8") : "";
    assert.ok(!failed.includes('"error"'), failed);
    return fs.existsSync(`${seenPath}.step`) && fs.readFileSync(`${seenPath}.step`, "utf8") === step;
  });
  let last = null;
  await until(`the page when ${step}`, async () => {
    last = await ask(page);
    return last !== null && wanted(last);
  }).catch((error) => {
    throw new Error(`${error.message}: ${JSON.stringify(last)}`);
  });
  await page.screenshot({ path: picture.replace(".png", `-${step}.png`) });
  fs.writeFileSync(`${seenPath}.${step}`, "");
  return last;
}

/// The problems view, and the lines that are drawn under the text.
async function problems(page) {
  const texts = (selector) => page.locator(selector).allTextContents();
  return { rows: await texts(".markers-panel .monaco-list-row"), drawn: await page.locator(".view-overlays .squiggly-error").count() };
}

/// The size of the lowest gap in meV, as the picture's second line tells it.
const told = (panel) => Number(/gap 1 ([\d.]+)\s*meV/.exec(panel.texts[1])?.[1]);

const browser = await chromium.launch({ executablePath: "/usr/bin/chromium", args: ["--no-sandbox"] });
try {
  const page = await browser.newPage();
  await page.setViewportSize({ width: 1760, height: 990 });
  await page.goto(address);
  await look(page, "found", (found) => found.drawn > 0 && found.rows.some((row) => row.includes("unknown-name")), problems);
  // Four bands are solved where none says how many, and each is one line of E(k); two of them and the walls are drawn.
  const opened = await look(page, "opened", (panel) => panel.dispersion === 4 && !panel.stale);
  assert.equal(opened.texts[0], "tern");
  assert.equal(opened.potential, 1);
  assert.equal(opened.bands, 2);
  assert.ok(Math.abs(told(opened) - 82.8358) < 0.06, opened.texts[1]);
  await look(page, "more", (panel) => panel.dispersion === 6 && !panel.stale);
  // The well is made narrower: another gap, and the second band now rises over the walls.
  const typed = await look(page, "typed", (panel) => !panel.stale && Math.abs(told(panel) - 127.3371) < 0.06);
  assert.equal(typed.dispersion, 6);
  assert.equal(typed.potential, 1);
  await look(page, "broken", (panel) => panel.stale && panel.trouble !== "");
  await until("the probe", () => fs.existsSync(seenPath) && fs.readFileSync(seenPath, "utf8").endsWith("}"));
  await page.screenshot({ path: picture });
} finally {
  await browser.close();
}

const seen = JSON.parse(fs.readFileSync(seenPath, "utf8"));
if (seen.error) {
  console.error(seen);
  process.exit(1);
}
// The gaps are those of neovim/test/expected.py: the closed form of two layers a cell.
const gap = (text) => Number(/([\d.]+)\s*meV/.exec(text)?.[1]);
assert.equal(seen.language, "crenate");
assert.deepEqual(seen.finding.start, [10, 18]);
assert.match(seen.finding.link, /^file:.*unknown-name\.md$/);
assert.ok(Math.abs(gap(seen.before) - 127.3371) < 0.06, seen.before);
assert.ok(Math.abs(gap(seen.after) - 82.8358) < 0.06, seen.after);
assert.ok(seen.hints.some(([line, label]) => line === 8 && label.includes("82.8")), JSON.stringify(seen.hints));
assert.deepEqual(seen.symbols, ["basin", "wall", "tern"]);
assert.deepEqual([...seen.completion].sort(), ["basin", "wall"]);
assert.deepEqual(seen.definition, [4]);
assert.equal(seen.renamed, 2);
assert.ok(seen.text.includes("  layer     8.4 nm of basin\n"), seen.text);
