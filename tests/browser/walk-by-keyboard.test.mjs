// SPDX-License-Identifier: GPL-3.0-or-later
// The same job by keyboard alone: nothing here touches a pointer. The focus must be visible and must never be lost.
import assert from "node:assert/strict";
import { after, before, test } from "node:test";
import { agenda, browse, focused, json, openPage, picture, settled, start } from "./program.mjs";

let program, browser, page;

before(async () => {
  program = start("demo");
  browser = await browse();
  page = await openPage(browser, await program.address);
  await settled(page);
});
after(async () => {
  await browser?.close();
  await program?.stop();
});

const press = async (...keys) => {
  for (const key of keys) await page.keyboard.press(key);
};
const name = () => page.evaluate(() => location.hash.slice(1).split("?")[0]);
const discrepancies = () => json(page, "/exhibit/discrepancies.json");
const versionShown = () => page.evaluate(() => Number(document.querySelector("#top .facts").innerText.match(/after decision (\d+)/)?.[1] ?? 0));

async function until(what, fits, key = "Tab", most = 500) {
  for (let pressed = 0; pressed < most; pressed++) {
    const here = await focused(page);
    if (fits(here)) return here;
    await press(key);
  }
  return assert.fail(`${what} was not reached with ${most} times ${key}`);
}

async function writeAndRecord(fields) {
  await page.waitForSelector("form.decision");
  const was = await versionShown();
  const asked = await page.evaluate(() => [...document.querySelector("form.decision").elements].filter((one) => one.name && one.type !== "checkbox").map((one) => one.name));
  const told = { who: "Ada Quay", role: "data manager", ...fields };
  for (const field of asked.filter((one) => told[one] !== undefined)) {
    await until(field, (here) => here.name === field);
    await page.keyboard.type(told[field]);
  }
  if ((await focused(page)).tag === "textarea") await until("the button that records", (here) => here.tag === "button");
  await press("Enter");
  await page.waitForFunction((before) => Number(document.querySelector("#top .facts").innerText.match(/after decision (\d+)/)?.[1] ?? 0) > before, was);
  await settled(page);
}

async function toItem(number) {
  const here = await page.evaluate(() => Number(document.querySelector("#agenda .here .count").textContent));
  for (let at = here; at !== number; at += Math.sign(number - here)) {
    await press(number > here ? "ArrowDown" : "ArrowUp");
    await page.waitForFunction((wanted) => document.querySelector("#agenda .here .count")?.textContent === String(wanted), at + Math.sign(number - here));
  }
  await settled(page);
}

// Steps through the list with n until a discrepancy of the check is taken up.
async function take(check, fits = () => true) {
  await toItem(2);
  const { discrepancies: list } = await discrepancies();
  for (let step = 0; step <= list.length; step++) {
    const id = await page.evaluate(() => document.querySelector("li.at")?.dataset.id);
    const found = list.find((one) => one.id === id);
    if (found?.check === check && found.state === "open" && fits(found)) return found;
    await press("n");
  }
  return assert.fail(`no open discrepancy of ${check} was reached with n`);
}
const stateOf = async (id) => (await discrepancies()).discrepancies.find((one) => one.id === id)?.state;

test("page down walks through every exhibit in order, page up comes back, up and down go through the agenda", async () => {
  const exhibits = (await agenda(page)).items.flatMap((item) => item.exhibits.map((exhibit) => exhibit.name));
  const seen = [await name()];
  for (let step = 1; step < exhibits.length; step++) {
    await press("PageDown");
    await page.waitForFunction((wanted) => document.querySelector("#main .exhibit")?.dataset.exhibit === wanted, exhibits[step]);
    seen.push(await name());
  }
  assert.deepEqual(seen, exhibits);
  await press("PageUp");
  await page.waitForFunction((wanted) => document.querySelector("#main .exhibit")?.dataset.exhibit === wanted, exhibits.at(-2));
  for (const item of [1, 9, 5]) await toItem(item);
});

test("left and right go through the tabs; the focus stays on the tab", async () => {
  await toItem(5);
  while ((await name()) !== "change-by-arm") {
    await press("PageDown");
    await settled(page);
  }
  await press("ArrowRight");
  await page.waitForFunction(() => location.hash.includes("by="));
  await settled(page);
  await press("ArrowLeft");
  await page.waitForFunction(() => !location.hash.includes("by="));
  await until("a tab", (here) => here.value !== null);
  await until("the tabs of groups", (here) => here.value === "sex");
  await press("Enter");
  await page.waitForFunction(() => location.hash.includes("by=sex"));
  await settled(page);
  assert.equal((await focused(page)).value, "sex");
});

test("Enter on a point opens its participant, Escape closes, and the focus is on the point again", async () => {
  const point = await until("a point", (here) => here.participant !== null);
  assert.ok(await page.evaluate(() => {
    const style = getComputedStyle(document.activeElement);
    return style.outlineStyle !== "none" && Number.parseFloat(style.outlineWidth) >= 2;
  }), "the focus on a point is seen");
  await press("Enter");
  await page.waitForSelector("#participant");
  await page.waitForFunction(() => document.activeElement.id === "participant");
  assert.equal(await page.locator("#participant").innerText(), point.participant);
  await press("Escape");
  await page.waitForSelector("#panel", { state: "hidden" });
  await page.waitForFunction((id) => document.activeElement.dataset.participant === id, point.participant);
});

test("b goes to baseline beside follow-up and back", async () => {
  const before = await page.evaluate(() => location.hash);
  await press("b");
  await page.waitForFunction((was) => location.hash !== was, before);
  await settled(page);
  assert.equal(await page.locator(".failing").count(), 0);
  await press("b");
  await page.waitForFunction((was) => location.hash === was, before);
  await settled(page);
});

test("a accepts the proposal: a code in other letters; the next one is taken up", async () => {
  const found = await take("category-variant");
  await press("a");
  await writeAndRecord({ reason: "The same code in other letters" });
  assert.equal(await stateOf(found.id), "settled");
  await page.waitForFunction(() => document.activeElement.dataset.key?.startsWith("item-"));
});

test("a settles the decimal comma", async () => {
  const found = await take("unreadable-number", (one) => one.proposal?.kind === "number-format");
  await press("a");
  await writeAndRecord({ reason: "The site's keyboard writes a comma" });
  assert.equal(await stateOf(found.id), "settled");
});

test("e corrects, c confirms, s sets missing, q asks, l leaves for later", async () => {
  let found = await take("out-of-plausible-range", (one) => one.column === "age");
  await press("e");
  await writeAndRecord({ to: "46", reason: "A digit too many" });
  assert.equal(await stateOf(found.id), "settled");
  found = await take("out-of-eligibility");
  await press("c");
  await writeAndRecord({ reason: "Measured again" });
  assert.equal(await stateOf(found.id), "settled");
  found = await take("out-of-plausible-range");
  await press("s");
  await writeAndRecord({ reason: "Not readable at its source" });
  assert.equal(await stateOf(found.id), "settled");
  const open = (await discrepancies()).discrepancies.find((one) => one.state === "open" && one.participant && one.value !== null && !one.rows);
  found = await take(open.check, (one) => one.id === open.id);
  await press("q");
  await writeAndRecord({ question: "What does the source say?", reason: "Not to be settled from here" });
  assert.equal(await stateOf(found.id), "queried");
  await toItem(2);
  const at = await page.evaluate(() => document.querySelector("li.at").dataset.id);
  await press("l");
  assert.notEqual(await page.evaluate(() => document.querySelector("li.at").dataset.id), at);
});

test("the record that stands of a repeated participant is chosen", async () => {
  const found = await take("repeated-participant");
  await until("the button of a record", (here) => here.key === `keep-${found.rows.at(-1)}`);
  await press("Enter");
  await writeAndRecord({ reason: "Checked against the form" });
  assert.equal(await stateOf(found.id), "settled");
});

test("Escape leaves a form without recording", async () => {
  const was = await versionShown();
  await take("out-of-eligibility");
  await press("c");
  await page.waitForSelector("form.decision");
  await press("Escape");
  await page.waitForSelector("form.decision", { state: "detached" });
  assert.equal(await versionShown(), was);
  await page.waitForFunction(() => document.activeElement.dataset.key?.startsWith("item-"));
});

test("a value that no check doubts is corrected from the panel", async () => {
  await toItem(5);
  await until("a point", (here) => here.participant !== null);
  await press("Enter");
  await page.waitForSelector("#participant");
  await page.waitForFunction(() => document.activeElement.id === "participant");
  const participant = await page.locator("#participant").innerText();
  const { values } = await json(page, `/exhibit/participant.json?participant=${participant}`);
  const value = values.find((one) => one.kind === "number" && one.state === "observed");
  await until("the variable", (here) => here.key === `value-${value.column}`);
  await press("Enter");
  await until("Correct", (here) => here.key === `act-correct-${value.column}`);
  await press("Enter");
  await writeAndRecord({ to: "50", reason: "Read from the source" });
  const now = await json(page, `/exhibit/participant.json?participant=${participant}`);
  assert.equal(now.values.find((one) => one.column === value.column).current, "50");
  assert.equal((await focused(page)).key, `value-${value.column}`);
  await press("Escape");
});

test("a decision is reversed from the record", async () => {
  const { decisions } = await json(page, "/exhibit/decisions.json");
  const last = decisions.filter((one) => one.reversible).at(-1);
  await toItem(9);
  await until("its button", (here) => here.key === `reverse-${last.number}`);
  await press("Enter");
  await writeAndRecord({ reason: "Taken back" });
  const now = (await json(page, "/exhibit/decisions.json")).decisions;
  assert.equal(now.find((one) => one.number === last.number).stands, false);
  assert.notEqual((await focused(page)).tag, "body");
});

test("scale, note and keys: item 4, a note, the list of keys", async () => {
  await toItem(4);
  await until("the other scale", (here) => here.key === "scale-log10");
  await press("Enter");
  await writeAndRecord({ reason: "Agreed from all participants together" });
  await toItem(6);
  await until("the note", (here) => here.key === "note");
  await press("Enter");
  await writeAndRecord({ text: "As expected." });
  assert.match(await page.locator(".concluded").innerText(), /As expected\./);
  await press("?");
  await page.waitForSelector("dialog[open] .key-lists");
  await picture(page, "keys");
  await press("Escape");
  await page.waitForSelector("dialog[open]", { state: "detached" }).catch(() => {});
  assert.equal(await page.locator("dialog[open]").count(), 0);
});

test("m shows the meeting view, page keys walk on in it, Escape leaves it", async () => {
  await press("m");
  await page.waitForSelector("body.meeting");
  const was = await name();
  await press("PageUp");
  await page.waitForFunction((before) => !location.hash.startsWith(`#${before}?`), was);
  assert.ok(await page.evaluate(() => location.hash.includes("meeting=1")));
  await press("Escape");
  await page.waitForSelector("body:not(.meeting)");
});

test("unblinding by keyboard", async () => {
  await toItem(9);
  await until("the button", (here) => here.key === "unblind-unblinded");
  await press("Enter");
  await writeAndRecord({ reason: "All is settled" });
  assert.equal(await page.locator("#top .blinding").innerText(), "UNBLINDED");
});

test("headings, landmarks and names are there for a screen reader", async () => {
  const found = await page.evaluate(() => ({
    h1: document.querySelectorAll("h1").length, h2: document.querySelectorAll("#main h2").length, live: document.querySelector("#live").getAttribute("aria-live"),
    nameless: [...document.querySelectorAll("button, a, input, select, textarea")].filter((one) => one.checkVisibility() && !(one.getAttribute("aria-label") || one.textContent.trim() || one.labels?.length || one.title)).map((one) => one.outerHTML.slice(0, 80)),
    landmarks: ["header", "nav", "main", "aside"].filter((tag) => document.querySelector(tag)?.getAttribute("aria-label")),
  }));
  assert.equal(found.h1, 1);
  assert.equal(found.h2, 1);
  assert.equal(found.live, "polite");
  assert.deepEqual(found.nameless, []);
  assert.deepEqual(found.landmarks, ["header", "nav", "main", "aside"]);
});

test("nothing was asked of another host and the page had no fault", () => {
  assert.deepEqual(page.watch.elsewhere, []);
  assert.deepEqual(page.watch.faults, []);
});
