// Pictures of a report for people to look at: node shoot.mjs REPORT.html INTO
import { chromium } from "playwright-core";
import { flags } from "./browser.mjs";
const [page_file, into] = process.argv.slice(2);
const browser = await chromium.launch({ executablePath: "/usr/bin/chromium", args: flags });
for (const scheme of ["light", "dark"]) {
  for (const width of [360, 800, 1400]) {
    const page = await browser.newPage({ viewport: { width, height: 900 }, colorScheme: scheme });
    await page.goto("file://" + page_file);
    await page.screenshot({ path: `${into}/${scheme}-${width}.png`, fullPage: true });
    await page.close();
  }
}
const page = await browser.newPage();
await page.goto("file://" + page_file);
await page.pdf({ path: `${into}/print.pdf`, preferCSSPageSize: true, printBackground: true });
await browser.close();
