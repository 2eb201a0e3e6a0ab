// SPDX-License-Identifier: GPL-3.0-or-later
// The whole of what a person does in the demonstration study, by mouse: every item and exhibit, values settled from the
// list and from a participant's panel, a reversal, a scale, a note, and unblinding; and that the screen follows each time.
import assert from "node:assert/strict";
import { after, before, test } from "node:test";
import { agenda, browse, goTo, json, openPage, picture, replies, settled, start } from "./program.mjs";

let program, browser, page;

before(async () => {
  program = start("demo");
  browser = await browse();
  page = await openPage(browser, await program.address);
});
after(async () => {
  await browser?.close();
  await program?.stop();
});

const text = (selector) => page.locator(selector).first().innerText();
const discrepancies = () => json(page, "/exhibit/discrepancies.json");
const versionShown = async () => Number((await text("#top .facts")).match(/after decision (\d+)/)?.[1] ?? 0);

// Opens an open discrepancy of a check in the list and gives it back.
async function take(check, fits = () => true) {
  await page.click('[data-key="agenda-2"]');
  await settled(page);
  const { discrepancies: list } = await discrepancies();
  const found = list.find((one) => one.check === check && one.state === "open" && fits(one));
  assert.ok(found, `an open discrepancy of the check ${check}`);
  const item = page.locator(`[data-key="item-${found.id}"]`);
  if ((await item.getAttribute("aria-expanded")) !== "true") await item.click();
  await page.waitForSelector(`li.at[data-id="${found.id}"]`);
  return found;
}

// Fills the form that is open and records; asserts that version, list and line on top follow.
async function record(reason, fields = {}) {
  const was = await versionShown();
  const form = page.locator("form.decision");
  await form.waitFor();
  if (await form.locator("[name=who]").count()) {
    await form.locator("[name=who]").fill("Ada Quay");
    await form.locator("[name=role]").fill("data manager");
  }
  for (const [name, value] of Object.entries(fields)) {
    const field = form.locator(`[name=${name}]`);
    if ((await field.evaluate((element) => element.tagName)) === "SELECT") await field.selectOption(value);
    else await field.fill(value);
  }
  if (reason) await form.locator("[name=reason]").fill(reason);
  await form.locator("button[type=submit]").click();
  await page.waitForFunction((before) => Number(document.querySelector("#top .facts").innerText.match(/after decision (\d+)/)?.[1] ?? 0) > before, was);
  await settled(page);
  await page.waitForFunction(() => /^Decisions? \d+.* recorded/.test(document.querySelector("#live").textContent));
  return versionShown();
}

const stateOf = async (id) => (await discrepancies()).discrepancies.find((one) => one.id === id)?.state;

test("the agenda has nine items and the line on top says which trial, which data, which blinding", async () => {
  const { items, title } = await agenda(page);
  assert.equal(items.length, 9);
  assert.equal(await page.locator("#agenda .items > li").count(), 9);
  assert.equal(await text("#top h1"), title);
  assert.equal(await text("#top .blinding"), "CODED");
  assert.match(await text("#top .facts"), /data received \d+ \w+.*after decision \d+/);
  assert.match(await text(".fingerprint"), /^[0-9a-f]{4}·[0-9a-f]{4}·[0-9a-f]{4}$/);
});

test("every item and exhibit opens by click, says its question, and every tab of it changes screen and address", async () => {
  const { items } = await agenda(page);
  for (const item of items) {
    await page.click(`[data-key="agenda-${item.number}"]`);
    await settled(page);
    assert.equal(await page.locator("#agenda .here .count").first().innerText(), String(item.number));
    if (!item.exhibits.length) {
      assert.ok((await text(".sentence")).length > 20, `item ${item.number} says in a sentence why it is empty`);
      continue;
    }
    for (const exhibit of item.exhibits) {
      if (item.exhibits.length > 1) await page.click(`[data-key="exhibit-${exhibit.name}"]`);
      await page.waitForSelector(`#main .exhibit[data-exhibit="${exhibit.name}"]`);
      await settled(page);
      if (!exhibit.refused) assert.equal(await page.locator(".failing").count(), 0, `${exhibit.name} is shown`);
      assert.ok((await text(".question")).length > 10);
      const tabs = page.locator("#main .tabs a");
      for (let at = 0; at < (await tabs.count()); at++) {
        const [value, argument] = await tabs.nth(at).evaluate((tab) => [tab.dataset.value, tab.closest(".tabs").dataset.argument]);
        await tabs.nth(at).click();
        await settled(page);
        await page.waitForFunction(([name, wanted]) => document.querySelector(`.tabs[data-argument="${name}"] [data-value="${CSS.escape(wanted)}"]`)?.getAttribute("aria-current") === "true", [argument, value]);
        assert.equal(await page.locator(".failing").count(), 0, `${exhibit.name} ${argument}=${value} is shown`);
        if (value) assert.ok(decodeURIComponent(page.url().replaceAll("+", " ")).includes(`${argument}=${value}`));
      }
      await picture(page, `exhibit-${exhibit.number}-${exhibit.name}`);
    }
  }
  assert.deepEqual(page.watch.faults, []);
});

test("the address holds the screen: reload and back give it again", async () => {
  await goTo(page, "#change-by-arm?by=sex");
  const mark = page.locator("svg [data-participant]").first();
  const participant = await mark.getAttribute("data-participant");
  await mark.click();
  await page.waitForSelector("#participant");
  assert.equal(await text("#participant"), participant);
  await page.reload();
  await page.waitForSelector("#participant");
  await settled(page);
  assert.equal(await text("#participant"), participant);
  assert.equal(await page.locator('.tabs [data-value="sex"]').getAttribute("aria-current"), "true");
  await page.click('[data-key="panel-close"]');
  await page.waitForSelector("#panel", { state: "hidden" });
  await page.goBack();
  await page.waitForSelector("#participant");
  await page.click('[data-key="panel-close"]');
});

test("pointing at a participant marks the same one everywhere on the screen", async () => {
  await goTo(page, "#change-by-arm");
  const mark = page.locator("svg [data-participant]").nth(3);
  await mark.hover();
  const participant = await mark.getAttribute("data-participant");
  const marked = await page.evaluate(() => [...new Set([...document.querySelectorAll(".same")].map((one) => one.dataset.participant))]);
  assert.deepEqual(marked, [participant]);
});

test("a category written otherwise is read as the plan's code, and the list and the agenda follow", async () => {
  const openBefore = (await discrepancies()).counts.open;
  const found = await take("category-variant");
  await page.click('[data-key="do-a"]');
  await page.waitForSelector("form.decision .preview");
  await picture(page, "settle-read-as");
  await record("The same code in other letters");
  assert.equal(await stateOf(found.id), "settled");
  const { counts } = await discrepancies();
  assert.ok(counts.open < openBefore);
  assert.match(await text(".tabs [data-value=open]"), new RegExp(`${counts.open}\\b`));
  assert.match(await text('[data-key="agenda-2"] .open'), new RegExp(`${counts.open}\\b`));
  assert.match(await text("#top .facts"), /deciding: Ada Quay, data manager/);
});

test("a decimal comma is settled by the column's number format", async () => {
  const found = await take("unreadable-number", (one) => one.proposal?.kind === "number-format");
  await page.click('[data-key="do-a"]');
  await record("The site's keyboard writes a comma");
  assert.equal(await stateOf(found.id), "settled");
});

test("an impossible age is corrected in the participant's panel, and the panel shows received and current", async () => {
  const found = await take("out-of-plausible-range", (one) => one.column === "age");
  await page.click('[data-key="do-Enter"]');
  await page.waitForSelector("#participant");
  assert.equal(await text("#participant"), found.participant);
  await picture(page, "panel-doubtful");
  await page.locator(`[data-key="act-correct-age"]`).first().click();
  await page.fill("form.decision [name=to]", "46");
  assert.match(await text("form.decision .preview"), /460[\s\S]*46/);
  await picture(page, "panel-correct");
  await record("A digit too many", { to: "46", evidence: "Clinic sheet, page 1" });
  const answer = await json(page, `/exhibit/participant.json?participant=${found.participant}`);
  assert.equal(answer.values.find((value) => value.column === "age").current, "46");
  const row = page.locator("#panel tr", { has: page.locator('[data-key="value-age"]') });
  assert.match(await row.innerText(), /460[\s\S]*46/);
  assert.equal(await row.locator(".replaced").innerText(), "460");
  assert.match(await page.locator("#panel .decisions").innerText(), /A digit too many/);
  await page.click('[data-key="panel-close"]');
  assert.equal(await stateOf(found.id), "settled");
});

test("a value is set missing from the list", async () => {
  const found = await take("out-of-plausible-range");
  await page.click('[data-key="do-s"]');
  await record("Not readable at its source");
  assert.equal(await stateOf(found.id), "settled");
  const answer = await json(page, `/exhibit/participant.json?participant=${found.participant}`);
  const value = answer.values.find((one) => one.column === found.column);
  assert.equal(value.state, "set-missing");
});

test("several outside eligibility are confirmed together with one reason", async () => {
  const found = await take("out-of-eligibility");
  const others = (await discrepancies()).discrepancies.filter((one) => one.check === found.check && one.column === found.column && one.state === "open").length;
  await page.click('[data-key="do-c"]');
  await page.waitForSelector("form.decision");
  if (others > 1) await page.check("form.decision [name=alike]");
  await record("Measured again at screening");
  const { discrepancies: list } = await discrepancies();
  assert.equal(list.filter((one) => one.check === found.check && one.column === found.column && one.state === "open").length, 0);
});

test("of a participant entered twice one record is kept, and the counts follow", async () => {
  const found = await take("repeated-participant");
  await picture(page, "settle-repeated");
  const row = found.rows.at(-1);
  await page.click(`[data-key="keep-${row}"]`);
  await record("The later entry was checked against the form");
  assert.equal(await stateOf(found.id), "settled");
  await page.click('[data-key="agenda-1"]');
  await settled(page);
});

test("a query is a question to the site; the discrepancy waits for its answer", async () => {
  await page.click('[data-key="agenda-2"]');
  const { discrepancies: list } = await discrepancies();
  const found = await take(list.find((one) => one.state === "open" && one.participant && one.value !== null && !one.rows).check, (one) => one.participant && one.value !== null && !one.rows);
  await page.click('[data-key="do-q"]');
  await record("Not to be settled from here", { question: "What does the source say?" });
  assert.equal(await stateOf(found.id), "queried");
  await goTo(page, `#discrepancies?${new URLSearchParams({ show: "all", at: found.id })}`);
  await page.waitForSelector(`li.at[data-id="${found.id}"]`);
  await page.click('[data-key="do-r"]');
  await page.waitForSelector("form.decision");
  assert.match(await text("form.decision"), /What does the source say\?/);
  await record(null, { text: "The source says the same." });
  const { decisions } = await json(page, "/exhibit/decisions.json");
  assert.equal(decisions.at(-1).kind, "response");
  assert.match(decisions.at(-1).words, /The source says the same\./);
});

test("a decision is reversed where it stands, in the participant's panel", async () => {
  const { decisions } = await json(page, "/exhibit/decisions.json");
  const correction = decisions.find((decision) => decision.kind === "correct" && decision.column === "age");
  await goTo(page, `#baseline?panel=${correction.participant}`);
  await page.click(`[data-key="panel-reverse-${correction.number}"]`);
  await record("Not yet seen at the source");
  await page.waitForFunction(() => /Reversed/.test(document.querySelector("#panel .decisions").innerText));
  const answer = await json(page, `/exhibit/participant.json?participant=${correction.participant}`);
  assert.equal(answer.values.find((value) => value.column === "age").current, "460");
  await page.click('[data-key="panel-close"]');
});

test("a reversal is an entry of its own, and what it took back is open again", async () => {
  const found = (await discrepancies()).discrepancies.find((one) => one.check === "out-of-eligibility" && one.settled_by);
  await page.click('[data-key="agenda-9"]');
  await settled(page);
  await page.waitForSelector(`[data-key="reverse-${found.settled_by}"]`);
  await picture(page, "record");
  await page.click(`[data-key="reverse-${found.settled_by}"]`);
  const version = await record("The wrong participant");
  assert.equal(await page.locator(`[data-key="reverse-${found.settled_by}"]`).count(), 0);
  assert.match(await text("#main .tables"), /reversed/);
  assert.equal((await json(page, "/exhibit/decisions.json")).decisions.length, version);
  assert.equal(await stateOf(found.id), "open");
});

test("the scale of an outcome is decided in item 4 and the effect follows", async () => {
  const outcome = (await agenda(page)).outcomes.at(-1);
  const was = (await json(page, `/exhibit/effect.json?outcome=${outcome.id}`)).contrasts[0].estimates[0];
  await page.click('[data-key="agenda-4"]');
  await settled(page);
  await page.locator(`#main .tabs a[aria-label^="${outcome.label}"], #main .tabs a[data-value="${outcome.id}"]`).first().click();
  await settled(page);
  const current = outcome.scale ?? "log10";
  await page.click(`[data-key="scale-${current === "log10" ? "linear" : "log10"}"]`);
  await page.waitForSelector("dialog form.decision");
  await picture(page, "scale");
  await record("Agreed from all participants together");
  const now = (await json(page, `/exhibit/effect.json?outcome=${outcome.id}`)).contrasts[0].estimates[0];
  assert.notEqual(now.estimate, was.estimate);
});

test("what the team concluded stands under its exhibit, also after a reload", async () => {
  await goTo(page, "#effect");
  await page.click('[data-key="note"]');
  await record(null, { text: "The interval lies within what was expected." });
  assert.match(await text(".concluded"), /The interval lies within what was expected\.[\s\S]*Ada Quay, data manager/);
  await page.reload();
  await page.waitForSelector(".concluded blockquote");
});

test("what somebody else recorded meanwhile is shown, and the person goes on", async () => {
  await take("out-of-eligibility");
  await page.click('[data-key="do-c"]');
  await page.waitForSelector("form.decision");
  await page.evaluate(async () => {
    const { version } = await (await fetch("/agenda.json")).json();
    const reply = await fetch("/decisions", { method: "POST", headers: { "Content-Type": "application/json" }, body: JSON.stringify({ version, by: "Ben Pier, statistician", decisions: [{ kind: "note", exhibit: "effect", text: "Looked at twice." }] }) });
    if (!reply.ok) throw new Error(await reply.text());
  });
  await page.fill("form.decision [name=reason]", "Seen at the source");
  await page.click("form.decision button[type=submit]");
  await page.waitForSelector("form.decision .trouble li");
  assert.match(await text("form.decision .trouble"), /Ben Pier, statistician/);
  assert.equal(await page.inputValue("form.decision [name=reason]"), "Seen at the source");
  await picture(page, "meanwhile");
  await record(null);
});

test("who attends is entered and shown", async () => {
  await page.click('[data-key="attending"]');
  await record(null, { people: "Chief investigator\nTrial statistician" });
  assert.match(await text(".attending"), /Chief investigator/);
});

test("while coded no reply carried an arm's code or name; unblinding is a decision after which they are shown", async () => {
  assert.equal(await text("#top .blinding"), "CODED");
  for (const { url, text: body } of await replies(page)) {
    if (/\.(js|css|svg)$/.test(new URL(url).pathname) && !url.includes("/exhibit/")) continue;
    assert.ok(!/Printed advice|Walking group/i.test(body), `${url} names an arm`);
    assert.ok(!/"(arm|code|grp)"\s*:\s*"[LW]"/.test(body) && !/>\s*[LW]\s*</.test(body), `${url} has an arm's code`);
  }
  await page.click('[data-key="agenda-9"]');
  await settled(page);
  await page.click('[data-key="unblind-unblinded"]');
  await page.waitForSelector("dialog form.decision");
  await picture(page, "unblind");
  await record("All discrepancies are settled");
  assert.equal(await text("#top .blinding"), "UNBLINDED");
  await page.click('[data-key="agenda-6"]');
  await settled(page);
  assert.match(await text("#main"), /Walking group/);
  await picture(page, "effect-unblinded");
});

test("nothing was asked of another host and the page had no fault", () => {
  assert.deepEqual(page.watch.elsewhere, []);
  assert.deepEqual(page.watch.faults, []);
});
