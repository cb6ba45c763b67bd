// The report as a reader meets it: opened by file URL in a headless Chromium that may ask nobody for anything.
// FOLDER: one comparison a stage of stages/, and "demo"; made by ./run.
import assert from "node:assert/strict";
import { existsSync, readFileSync, statSync } from "node:fs";
import { createRequire } from "node:module";
import { after, before, describe, test } from "node:test";
import { chromium } from "playwright-core";
import { flags } from "./browser.mjs";

const folder = process.env.FOLDER;
const names = ["demo", "alone", "direct", "ground", "many"];
const axe = readFileSync(createRequire(import.meta.url).resolve("axe-core/axe.min.js"), "utf8");
let browser;

before(async () => {
  browser = await chromium.launch({ executablePath: process.env.CHROMIUM ?? "/usr/bin/chromium", args: flags });
});
after(() => browser.close());

// Opens a page; what it asks for, and what it complains of, is kept.
const open = async (name, { width = 1400, scheme = "light", script = true } = {}) => {
  const context = await browser.newContext({
    viewport: { width, height: 900 }, colorScheme: scheme, javaScriptEnabled: script, offline: true,
  });
  const page = await context.newPage();
  const seen = { requests: [], errors: [] };
  page.on("request", (request) => seen.requests.push(request.url()));
  page.on("pageerror", (error) => seen.errors.push(String(error)));
  page.on("dialog", (dialog) => { seen.errors.push("dialog: " + dialog.message()); dialog.dismiss(); });
  page.on("console", (message) => message.type() === "error" && seen.errors.push(message.text()));
  await page.goto(`file://${folder}/${name}/report.html`);
  return { page, seen, close: () => context.close() };
};

const json = (name) => JSON.parse(readFileSync(`${folder}/${name}/report.json`, "utf8"));
const at = (document, pointer) =>
  pointer.split("/").slice(1).reduce((value, key) => value[key.replaceAll("~1", "/").replaceAll("~0", "~")], document);

// "−3.5 mV" as a number in SI units and the half of its last digit.
const units = { "": 1, V: 1, mV: 1e-3, µV: 1e-6, mA: 1e-3, µA: 1e-6, nA: 1e-9, W: 1, mW: 1e-3, "%": 1, mS: 1e-3, kΩ: 1e3,
  MΩ: 1e6, Ω: 1, dB: 1, k: 1e3 };
const read = (text) => {
  const match = /^(−?)(\d+(?:\.(\d+))?)\s*([^\d\s]*)$/u.exec(text.trim());
  assert.ok(match, `a figure that cannot be read: ${text}`);
  const [, minus, digits, decimals = "", unit] = match;
  assert.ok(unit in units, `an unknown unit: ${text}`);
  const value = Number(digits) * units[unit] * (minus ? -1 : 1);
  return { value, half: 0.5 * 10 ** -decimals.length * units[unit] };
};

for (const name of names) {
  describe(name, () => {
    test("asks nobody for anything and is under 2 MB", async () => {
      const { page, seen, close } = await open(name);
      await page.waitForTimeout(200);
      assert.deepEqual(seen.requests.filter((url) => !url.endsWith("/report.html")), []);
      assert.deepEqual(seen.errors, []);
      assert.ok(statSync(`${folder}/${name}/report.html`).size < 2e6);
      const listed = await page.$$eval("audio", (all) => all.map((audio) => audio.getAttribute("src")));
      assert.ok(listed.length > 0);
      for (const file of listed) assert.ok(existsSync(`${folder}/${name}/${decodeURIComponent(file)}`), file);
      await close();
    });

    test("shows the figures of report.json as rounded", async () => {
      const { page, close } = await open(name, { script: false });
      const document = json(name);
      const shown = await page.$$eval("[data-json]", (all) =>
        all.map((one) => ({ text: one.textContent, json: one.dataset.json, operation: one.dataset.operation ?? "value" })));
      assert.ok(shown.length > 40 * document.configurations.length, `${shown.length} figures`);
      for (const { text, json: pointers, operation } of shown) {
        const values = pointers.split(" ").map((pointer) => at(document, pointer));
        const expected = { value: values[0], difference: values[0] - values[1], size: Math.hypot(...[values[0]].flat()) }[operation];
        assert.equal(typeof expected, "number", pointers);
        const { value, half } = read(text);
        assert.ok(Math.abs(value - expected) <= half * (1 + 1e-6), `${pointers}: ${text} for ${expected}`);
      }
      await close();
    });

    for (const width of [360, 800, 1400]) {
      test(`reads at ${width} pixels`, async () => {
        const { page, close } = await open(name, { width, script: false });
        const wide = await page.evaluate(() => document.documentElement.scrollWidth);
        assert.ok(wide <= width, `${wide} pixels wide`);
        const trouble = await page.evaluate(() => {
          const trouble = [];
          for (const svg of document.querySelectorAll("svg.picture")) {
            const name = svg.getAttribute("aria-label");
            const frame = svg.getBoundingClientRect();
            if (frame.width < 200 || frame.height < 100) trouble.push(`${name}: ${frame.width} × ${frame.height}`);
            const drawn = [...svg.querySelectorAll("path,line,rect,circle")].filter((one) => {
              const box = one.getBBox();
              return box.width + box.height > 0;
            });
            if (drawn.length < 8) trouble.push(`${name}: only ${drawn.length} things drawn`);
            const texts = [...svg.querySelectorAll("text")];
            if (texts.length < 3) trouble.push(`${name}: hardly a label`);
            // The glyphs stand between cap height and base line, less than their line box.
            const boxes = texts.map((text) => {
              const { x, y, width, height } = text.getBBox();
              return { text: text.textContent, left: x, right: x + width, top: y + 0.2 * height, bottom: y + 0.8 * height };
            });
            const room = svg.viewBox.baseVal;
            boxes.forEach((a, k) => {
              if (a.left < -0.5 || a.right > room.width + 0.5 || a.top < -0.5 || a.bottom > room.height + 0.5)
                trouble.push(`${name}: "${a.text}" leaves the picture`);
              for (const b of boxes.slice(k + 1))
                if (a.left < b.right && b.left < a.right && a.top < b.bottom && b.top < a.bottom)
                  trouble.push(`${name}: "${a.text}" over "${b.text}"`);
            });
          }
          return trouble;
        });
        assert.deepEqual(trouble, []);
        const pictures = await page.locator("svg.picture").count();
        const configurations = json(name).configurations.length;
        assert.ok(pictures >= 6 * configurations + 4, `${pictures} pictures`);
        await close();
      });
    }

    for (const scheme of ["light", "dark"]) {
      test(`nothing serious for axe-core, ${scheme}`, async () => {
        const { page, close } = await open(name, { width: 1000, scheme });
        await page.evaluate(axe);
        const found = await page.evaluate(() => axe.run(document, { resultTypes: ["violations"], preload: false }));
        const serious = found.violations.filter((v) => ["serious", "critical"].includes(v.impact));
        assert.deepEqual(serious.map((v) => `${v.id}: ${v.nodes[0].html.slice(0, 160)} ${v.nodes[0].failureSummary}`), []);
        await close();
      });

      test(`text of the pictures has AA contrast, ${scheme}`, async () => {
        // axe-core does not judge SVG text.
        const { page, close } = await open(name, { scheme });
        const poor = await page.evaluate(() => {
          const channel = (c) => (c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4);
          const luminance = (colour) => {
            const [r, g, b] = colour.match(/[\d.]+/g).map((c) => channel(Number(c) / 255));
            return 0.2126 * r + 0.7152 * g + 0.0722 * b;
          };
          const paper = luminance(getComputedStyle(document.body).backgroundColor);
          const poor = new Set();
          for (const text of document.querySelectorAll("svg.picture text")) {
            const ink = luminance(getComputedStyle(text).fill);
            const ratio = (Math.max(ink, paper) + 0.05) / (Math.min(ink, paper) + 0.05);
            if (ratio < 4.5) poor.add(`${text.getAttribute("class")}: ${ratio.toFixed(2)}`);
          }
          return [...poor];
        });
        assert.deepEqual(poor, []);
        await close();
      });
    }

    test("each bench sheet prints on one A4 page of its own", async () => {
      const { page, close } = await open(name);
      // A4 at 96 dots an inch, less the page's margins of 13 and 14 mm.
      await page.emulateMedia({ media: "print" });
      await page.setViewportSize({ width: Math.round((182 / 25.4) * 96), height: 1000 });
      const room = (271 / 25.4) * 96;
      const tall = await page.$$eval("section.sheet", (all) => all.map((one) => one.getBoundingClientRect().height));
      assert.equal(tall.length, json(name).configurations.length);
      for (const height of tall) assert.ok(height < room, `${height} of ${room}`);
      // And in truth: one sheet alone makes a document of one page.
      await page.evaluate(() => {
        document.body.dataset.print = "sheet";
        document.querySelector("section.sheet").classList.add("printed");
      });
      const pdf = (await page.pdf({ preferCSSPageSize: true })).toString("latin1");
      assert.equal(pdf.match(/\/Type\s*\/Page\b/g).length, 1);
      const [, width, height] = /\/MediaBox\s*\[0 0 ([\d.]+) ([\d.]+)\]/.exec(pdf);
      assert.ok(Math.abs(width - 595.3) < 1.5 && Math.abs(height - 841.9) < 1.5, `${width} × ${height}`);
      await close();
    });
  });
}

test("hostile words stay words", async () => {
  const { page, seen, close } = await open("direct");
  const title = await page.title();
  assert.ok(title.startsWith("</script><script>document.title='taken'</script>"), title);
  assert.equal(await page.locator("img").count(), 0);
  assert.equal(await page.locator("script").count(), 1);
  assert.deepEqual(seen.errors, []);
  const html = readFileSync(`${folder}/direct/report.html`, "utf8");
  assert.ok(!/[\u202a-\u202e\u2066-\u2069]/u.test(html), "a direction mark stands in the page");
  assert.ok(!html.includes("onerror=alert(1)>"), "a name stands in the page raw");
  await close();
});

test("the stage file is embedded as it was", async () => {
  const { page, close } = await open("direct");
  const link = await page.locator("a.download").getAttribute("href");
  const text = decodeURIComponent(link.slice(link.indexOf(",") + 1));
  assert.equal(text, readFileSync(new URL("stages/direct.toml", import.meta.url), "utf8"));
  await close();
});

test("exceeded limits come first, red, marked, with what to change", async () => {
  const { page, close } = await open("direct");
  const first = page.locator("main > section").first();
  assert.equal(await first.getAttribute("class"), "exceeded");
  const lines = await first.locator("li").allTextContents();
  const limits = json("direct").configurations.flatMap((c) => c.operating_point.warnings)
    .filter((warning) => warning.used_percent !== null);
  for (const { part, limit } of limits) {
    const told = lines.find((line) => line.includes(part) && line.includes(limit.replaceAll("_", " ")));
    assert.ok(told, `${part} ${limit}`);
    assert.match(told, /Fit|Raise|Lower|Elevate/);
  }
  assert.ok((await first.locator("h2").textContent()).includes("▲"));
  const colour = await first.locator("h2").evaluate((one) => getComputedStyle(one).color);
  assert.equal(colour, "rgb(179, 18, 29)");
  assert.ok(await page.locator(".schematic .over").count() > 0);
  await close();
});

test("a script only chooses: without it everything shows, with it one configuration can be looked at", async () => {
  const plain = await open("demo", { script: false });
  assert.equal(await plain.page.locator("section.configuration:visible").count(), 4);
  assert.equal(await plain.page.locator("section.sheet:visible").count(), 4);
  assert.equal(await plain.page.locator("button:visible").count(), 0);
  await plain.close();
  const { page, close } = await open("demo");
  await page.getByRole("button", { name: "Show configuration B" }).click();
  assert.deepEqual(await page.$$eval("section.configuration:not([hidden])", (all) => all.map((one) => one.dataset.letter)), ["B"]);
  await page.getByRole("button", { name: "all", exact: true }).click();
  assert.equal(await page.locator("section.configuration:visible").count(), 4);
  await close();
});

test("every drawing has the parts of its stage", async () => {
  const texts = async (name) => {
    const { page, close } = await open(name);
    const texts = await page.locator("svg.schematic").first().locator("text").allTextContents();
    await close();
    return texts;
  };
  const has = (texts, ...wanted) => wanted.forEach((text) => assert.ok(texts.some((t) => t.includes(text)), `${text}: ${texts}`));
  has(await texts("demo"), "290", "2k7", "39µ", "330R", "47k", "910R", "33k", "820R", "150µ", "0R12", "27k", "330n", "560R", "680k",
    "750R", "12k", "3µ3", "270k", "470p", "12AU7", "mA");
  has(await texts("alone"), "330", "10k", "22µ", "600R", "1M", "100k", "1k5", "22n", "470k", "12AX7");
  has(await texts("direct"), "460", "100k", "470k", "1k", "47k ▲", "470R", "10k ▲", "1µ ▲", "220k", "12AT7", "12AU7 ▲");
  has(await texts("ground"), "300", "22k", "33k", "100µ", "100n", "470k", "1k5", "10µ", "bench triode…", "6SN7GTB");
});
