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
const browser = await chromium.launch({ executablePath: "/usr/bin/chromium", args: ["--no-sandbox"] });
try {
  const page = await browser.newPage();
  await page.goto(address);
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
