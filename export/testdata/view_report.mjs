// Opens a report in headless Chromium (npm playwright-core, system chromium) and
// prints what was seen as JSON:
//
//   node view_report.mjs report.html [FOLDER for screenshots]
//
// ANTICLAST_NODE_MODULES names the folder in which "npm install playwright-core"
// was run; ANTICLAST_CHROMIUM the browser (default: chromium in the usual places).
import { createRequire } from "node:module";
import { existsSync, writeFileSync } from "node:fs";
import { join, resolve } from "node:path";

const home = resolve(process.env.ANTICLAST_NODE_MODULES || ".");
const { chromium } = createRequire(join(home, "package.json"))("playwright-core");
const executablePath = process.env.ANTICLAST_CHROMIUM || ["/usr/bin/chromium", "/usr/bin/chromium-browser", "/usr/bin/google-chrome"].find((p) => existsSync(p));
const [file, shots] = process.argv.slice(2);
const args = ["--no-sandbox", "--disable-gpu", "--use-angle=swiftshader", "--enable-unsafe-swiftshader", "--disable-quic", "--no-first-run",
  "--disable-background-networking", "--disable-component-update", "--disable-sync"];
const browser = await chromium.launch({ executablePath, args });
const seen = { errors: [], requests: [] };

async function open(options) {
  const page = await browser.newPage(options);
  page.on("console", (m) => { if (m.type() === "error") seen.errors.push(m.text()); });
  page.on("pageerror", (e) => seen.errors.push(e.message));
  page.on("request", (r) => { if (!/^(file|data):/.test(r.url())) seen.requests.push(r.url()); });
  await page.goto("file://" + resolve(file));
  await page.waitForTimeout(300);
  return page;
}
// Share of the canvas that is drawn on, and a sum that changes with the picture.
const pixels = (page) => page.evaluate(() => new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(() => {
  const c = document.querySelector("#live canvas"), gl = c.getContext("webgl2"), b = new Uint8Array(4 * c.width * c.height);
  gl.readPixels(0, 0, c.width, c.height, gl.RGBA, gl.UNSIGNED_BYTE, b);
  let drawn = 0, sum = 0;
  for (let i = 0; i < b.length; i += 4) if (b[i + 3]) { drawn++; sum = (sum * 31 + b[i] + i) % 1000003; }
  done({ share: drawn / (b.length / 4), sum });
}))));

const page = await open({ viewport: { width: 1200, height: 900 } });
seen.live = await page.locator("#live").isVisible();
seen.still = await page.locator("#still").isVisible();
if (seen.live) {
  await page.locator("#live").scrollIntoViewIfNeeded();
  seen.first = await pixels(page);
  const box = await page.locator("#live canvas").boundingBox();
  const x = box.x + box.width / 2, y = box.y + box.height / 2;
  await page.mouse.move(x, y); await page.mouse.down(); await page.mouse.move(x + 120, y + 40, { steps: 4 }); await page.mouse.up();
  seen.turned = await pixels(page);
  await page.locator("#live canvas").focus();
  await page.keyboard.press("Home"); await page.keyboard.press("ArrowLeft");
  seen.keyed = await pixels(page);
  await page.keyboard.press("Home");
  seen.back = await pixels(page);
  // From above, in the middle of the paper.
  await page.locator('button[data-view^="-90,89"]').click();
  await pixels(page);
  seen.tips = [];
  for (let i = 1; i < 8; i++) for (let j = 1; j < 8; j++) {
    await page.mouse.move(box.x + box.width * i / 8, box.y + box.height * j / 8);
    const t = await page.locator("#tip").evaluate((e) => e.style.display === "none" ? "" : e.textContent);
    if (t) seen.tips.push(t);
  }
  const layer = page.locator('button[data-layer="1"]');
  if (await layer.count()) { await layer.click(); seen.layer = await pixels(page); seen.pressed = await layer.getAttribute("aria-pressed"); }
  await page.locator('button[data-view^="-60"]').click();
}
const pdf = await page.pdf({ preferCSSPageSize: true, printBackground: true });
seen.pages = (pdf.toString("latin1").match(/\/Type\s*\/Page[^s]/g) || []).length;
seen.wide = await page.evaluate(() => document.documentElement.scrollWidth > innerWidth);
if (shots) {
  writeFileSync(join(shots, "report.pdf"), pdf);
  await page.screenshot({ path: join(shots, "desktop.png") });
  await page.locator("#still, #live").first().screenshot({ path: join(shots, "live.png") }).catch(() => {});
  if (seen.live) await page.locator("#live").screenshot({ path: join(shots, "live.png") });
}
await page.close();
for (const scheme of ["light", "dark"]) {
  const phone = await open({ viewport: { width: 390, height: 844 }, colorScheme: scheme, hasTouch: true, isMobile: true });
  seen.phoneWide ||= await phone.evaluate(() => document.documentElement.scrollWidth > 391);
  if (shots) await phone.screenshot({ path: join(shots, `phone-${scheme}.png`), fullPage: true });
  await phone.close();
}
const plain = await browser.newContext({ javaScriptEnabled: false });
const quiet = await plain.newPage();
await quiet.goto("file://" + resolve(file));
seen.withoutScripts = { still: await quiet.locator("#still").isVisible(), live: await quiet.locator("#live").isVisible().catch(() => false) };
await browser.close();
console.log(JSON.stringify(seen));
