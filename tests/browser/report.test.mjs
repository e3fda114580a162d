// Opens the pages of `dutybank report` from disk in headless Chromium: no message on the console, no request but for the page itself,
// nothing serious for accessibility (axe), nothing wider than a phone's screen, the same on a dark screen and without scripts.

import assert from "node:assert/strict";
import { execFileSync } from "node:child_process";
import { mkdtempSync, readdirSync, readFileSync, rmSync } from "node:fs";
import { createRequire } from "node:module";
import { tmpdir } from "node:os";
import { dirname, join } from "node:path";
import { after, before, test } from "node:test";
import { fileURLToPath, pathToFileURL } from "node:url";
import puppeteer from "puppeteer-core";

const root = join(dirname(fileURLToPath(import.meta.url)), "..", "..");
const target = process.env.CARGO_TARGET_DIR ?? join(root, "target");
const dutybank = join(target, "release", "dutybank");
const axe = readFileSync(createRequire(import.meta.url).resolve("axe-core/axe.min.js"), "utf8");
const networks = readdirSync(join(root, "networks")).filter((name) => name.endsWith(".yaml"));

let browser;
let folder;

before(async () => {
  folder = mkdtempSync(join(tmpdir(), "dutybank-"));
  browser = await puppeteer.launch({
    executablePath: process.env.CHROMIUM ?? "/usr/bin/chromium",
    args: ["--no-sandbox", "--disable-gpu"],
  });
});

after(async () => {
  await browser?.close();
  rmSync(folder, { recursive: true });
});

/** Opens the note of a network; `seen` collects what the page says and asks for. */
async function open(name, prepare = async () => {}) {
  const out = join(folder, `${name}.html`);
  execFileSync(dutybank, ["report", join(root, "networks", name), "--out", out]);
  const page = await browser.newPage();
  const seen = { messages: [], requests: [] };
  page.on("console", (message) => seen.messages.push(message.text()));
  page.on("pageerror", (error) => seen.messages.push(String(error)));
  page.on("request", (request) => seen.requests.push(request.url()));
  await prepare(page);
  const url = String(pathToFileURL(out));
  await page.goto(url, { waitUntil: "networkidle0" });
  return { page, seen, url };
}

for (const name of networks) {
  test(`${name} opens quietly and is accessible`, async () => {
    const { page, seen, url } = await open(name);
    assert.deepEqual(seen.messages, []);
    assert.deepEqual(seen.requests, [url]);
    for (const scheme of ["light", "dark"]) {
      await page.emulateMediaFeatures([{ name: "prefers-color-scheme", value: scheme }]);
      await page.evaluate(axe);
      const found = await page.evaluate(() => globalThis.axe.run());
      const serious = found.violations.filter((v) => ["serious", "critical"].includes(v.impact));
      const told = serious.map((v) => `${scheme} ${v.id}: ${v.nodes.slice(0, 3).map((n) => n.html.slice(0, 200)).join(" | ")}`);
      assert.deepEqual(told, []);
    }
    await page.close();
  });
}

test("a phone shows the page without sideways scrolling", async () => {
  const { page } = await open(networks[0], (page) => page.setViewport({ width: 390, height: 800, isMobile: true }));
  const [inner, whole] = await page.evaluate(() => [innerWidth, document.documentElement.scrollWidth]);
  assert.ok(whole <= inner, `${whole} > ${inner}`);
  await page.close();
});

test("everything is there without scripts", async () => {
  const plain = await open(networks[0], (page) => page.setJavaScriptEnabled(false));
  const scripted = await open(networks[0]);
  const text = (page) => page.$eval("main", (main) => main.textContent);
  assert.equal(await text(plain.page), await text(scripted.page));
  await plain.page.close();
  await scripted.page.close();
});
