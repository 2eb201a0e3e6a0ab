// SPDX-License-Identifier: GPL-3.0-or-later
// Starts the program and a browser for a test, and watches what every walk must keep: no request to another host, no
// fault in the page, and while the study is blinded nothing in any reply that names an arm.
import { spawn } from "node:child_process";
import { mkdirSync, mkdtempSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { dirname, join } from "node:path";
import { fileURLToPath } from "node:url";
import { chromium } from "playwright-core";

export const root = join(dirname(fileURLToPath(import.meta.url)), "..", "..");
const screenshots = join(root, "build", "screenshots");

export function temporary() {
  const folder = mkdtempSync(join(tmpdir(), "evenhand-browser-"));
  return { folder, remove: () => rmSync(folder, { recursive: true, force: true }) };
}

// Resolves with the printed address once the program serves.
export function start(...words) {
  const child = spawn(process.env.EVENHAND ?? join(root, "build", "evenhand"), [...words, "--no-browser", "--port", "0"], { stdio: ["ignore", "pipe", "pipe"] });
  let said = "";
  const address = new Promise((resolve, reject) => {
    const listen = (bytes) => {
      said += bytes;
      const found = said.match(/http:\/\/127\.0\.0\.1:\d+\/\?key=[0-9a-f]+/);
      if (found) resolve(found[0]);
    };
    child.stdout.on("data", listen);
    child.stderr.on("data", listen);
    child.on("exit", (status) => reject(new Error(`the program ended with ${status}: ${said}`)));
    setTimeout(() => reject(new Error(`no address within 20 s: ${said}`)), 20000).unref();
  });
  const ended = new Promise((resolve) => child.on("exit", resolve));
  return {
    address,
    stop: async () => {
      child.kill("SIGTERM");
      await ended;
    },
  };
}

export function browse() {
  return chromium.launch({ executablePath: "/usr/bin/chromium", args: ["--no-sandbox", "--disable-gpu", "--disable-background-networking", "--no-first-run"] });
}

// A page at the address, with what it must not do collected in page.watch.
export async function openPage(browser, address, size = { width: 1366, height: 768 }) {
  const context = await browser.newContext({ viewport: size, reducedMotion: "reduce", acceptDownloads: true });
  const page = await context.newPage();
  page.setDefaultTimeout(15000);
  const watch = { elsewhere: [], faults: [], replies: [], reading: [] };
  page.watch = watch;
  const host = new URL(address).host;
  page.on("request", (request) => {
    const url = new URL(request.url());
    if (url.protocol !== "blob:" && url.host !== host) watch.elsewhere.push(request.url());
  });
  page.on("response", (response) => {
    if (response.status() >= 300 && response.status() < 400) return;
    const late = new Promise((resolve) => setTimeout(resolve, 10000).unref());
    const body = response.text().then((text) => watch.replies.push({ url: response.url(), status: response.status(), text }));
    watch.reading.push(Promise.race([body, late]).catch(() => {})); // a request given up has no body
  });
  page.on("pageerror", (error) => watch.faults.push(error.stack ?? String(error)));
  page.on("console", (message) => {
    // The browser reports every reply of 400 or more here; those a walk asks for are its own business.
    if (message.type() === "error" && !/Failed to load resource/.test(message.text())) watch.faults.push(message.text());
  });
  await page.goto(address);
  await page.waitForSelector(".question");
  return page;
}

export async function replies(page) {
  await Promise.all(page.watch.reading);
  return page.watch.replies;
}

export async function picture(page, name) {
  mkdirSync(screenshots, { recursive: true });
  await page.screenshot({ path: join(screenshots, `${name}.png`) });
}

// Waits until nothing is being fetched or redrawn.
export async function settled(page) {
  await page.waitForFunction(() => document.querySelector("#main") && !document.querySelector("#main").hasAttribute("aria-busy") &&
    document.querySelector(".exhibit, .start, .plan-form") !== null);
  await page.waitForTimeout(60);
}

export async function goTo(page, hash) {
  await page.evaluate((to) => (location.hash = to), hash);
  await page.waitForFunction((name) => {
    const article = document.querySelector("#main .exhibit");
    return article && (article.dataset.exhibit ?? name) === name && !document.querySelector("#main").hasAttribute("aria-busy");
  }, hash.replace("#", "").split("?")[0]);
  await settled(page);
}

export const json = (page, path) => page.evaluate(async (to) => (await fetch(to)).json(), path);
export const agenda = (page) => json(page, "/agenda.json");
export const focused = (page) => page.evaluate(() => {
  const element = document.activeElement;
  return { tag: element.tagName.toLowerCase(), text: element.textContent.trim().slice(0, 80), name: element.getAttribute("name"), key: element.dataset?.key ?? null,
    participant: element.dataset?.participant ?? null, value: element.dataset?.value ?? null };
});

// Runs in the page: every text that can be seen, as boxes with the size of its letters.
function boxesInPage() {
  const shown = (element) => element.checkVisibility({ opacityProperty: true, visibilityProperty: true });
  const boxes = [];
  const walker = document.createTreeWalker(document.body, NodeFilter.SHOW_TEXT);
  for (let node = walker.nextNode(); node; node = walker.nextNode()) {
    const text = node.textContent.trim();
    const parent = node.parentElement;
    if (!text || !parent || !shown(parent) || parent.closest("noscript, option, .unseen, datalist, title, desc, dialog:not([open])")) continue;
    const svg = parent.closest("svg");
    const scale = svg ? parent.getScreenCTM().a : 1;
    const size = Number.parseFloat(getComputedStyle(parent).fontSize) * scale;
    const part = parent.closest("#top, #agenda, #panel, #foot, #said, dialog, #skip") ?? document.querySelector("#main");
    const range = document.createRange();
    range.selectNodeContents(node);
    for (const box of svg ? [parent.getBoundingClientRect()] : range.getClientRects()) {
      if (box.width < 1) continue;
      // Letters fill the middle of their line box.
      const trim = box.height * 0.2;
      const seen = { left: box.left + 1, right: box.right - 1, top: box.top + trim, bottom: box.bottom - trim };
      const clip = clipTo(parent, seen);
      if (seen.right <= seen.left || seen.bottom <= seen.top) continue; // scrolled out of its box
      boxes.push({ text: text.slice(0, 60), part: part?.id ?? "", size, ...seen, svg: svg && !clip.scrolls ? svg.getBoundingClientRect().toJSON() : null, parent, clip: clip.hides });
    }
  }
  // What can be scrolled to is not cut off: only what is in sight of it counts. What is hidden for good is.
  function clipTo(element, seen) {
    let scrolls = false;
    for (let at = element; at && at !== document.body; at = at.parentElement) {
      if (at instanceof SVGElement) continue;
      const style = getComputedStyle(at);
      const box = at.getBoundingClientRect();
      if (/(auto|scroll)/.test(style.overflowX + style.overflowY)) {
        scrolls = true;
        seen.left = Math.max(seen.left, box.left);
        seen.right = Math.min(seen.right, box.right);
        seen.top = Math.max(seen.top, box.top);
        seen.bottom = Math.min(seen.bottom, box.bottom);
      } else if (!scrolls && /(hidden|clip)/.test(style.overflowX + style.overflowY)) {
        return { scrolls, hides: box.toJSON() };
      }
    }
    return { scrolls, hides: null };
  }
  return boxes;
}

// What is wrong with the look of a page, as sentences: text over text, text cut off, a page wider than its window; and
// texts smaller than `least` px as shown.
function lookInPage(least, readBoxes) {
  const boxes = readBoxes();
  const faults = [];
  const { documentElement } = document;
  if (documentElement.scrollWidth > documentElement.clientWidth) faults.push(`the page is ${documentElement.scrollWidth} px wide in a window of ${documentElement.clientWidth}`);
  for (const { text, left, right, top, bottom, size, svg, clip } of boxes) {
    if (svg && (left < svg.left - 2 || right > svg.right + 2 || top < svg.top - 2 || bottom > svg.bottom + 2)) faults.push(`“${text}” leaves its figure`);
    if (clip && (right > clip.right + 1 || left < clip.left - 1 || bottom > clip.bottom + 1 || top < clip.top - 1)) faults.push(`“${text}” is cut off`);
    if (size < least - 0.05) faults.push(`“${text}” is ${size.toFixed(1)} px`);
  }
  boxes.sort((a, b) => a.top - b.top);
  for (let i = 0; i < boxes.length; i++) {
    const one = boxes[i];
    for (let k = i + 1; k < boxes.length && boxes[k].top < one.bottom; k++) {
      const other = boxes[k];
      if (one.part !== other.part || one.parent === other.parent) continue;
      const width = Math.min(one.right, other.right) - Math.max(one.left, other.left);
      const height = Math.min(one.bottom, other.bottom) - Math.max(one.top, other.top);
      if (width > 1 && height > 1) faults.push(`“${one.text}” and “${other.text}” overlap by ${width.toFixed(0)} x ${height.toFixed(0)} px`);
    }
  }
  return faults;
}

// The page's policy forbids making functions from text in it, so both go over as one.
const look = `(least) => { ${boxesInPage}; ${lookInPage}; return lookInPage(least, boxesInPage); }`;

export async function lookFaults(page, least = 0) {
  await page.evaluate(() => window.scrollTo(0, 0));
  return page.evaluate(`(${look})(${least})`);
}
