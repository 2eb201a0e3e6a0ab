// SPDX-License-Identifier: GPL-3.0-or-later
// A study from several files: people and visits dropped by mouse on the first page, how they lie said on the form; and the form
// for one file by keyboard alone. The two files are invented.
import assert from "node:assert/strict";
import { existsSync, writeFileSync } from "node:fs";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { agenda, browse, focused, json, lookFaults, openPage, picture, settled, start, temporary } from "./program.mjs";

let place, program, browser, page, address;

function people() {
  const lines = ["pid,arm,sex,age"];
  for (let i = 1; i <= 48; i++) lines.push(`P${100 + i},${i % 2 ? "walk" : "usual"},${i % 3 ? "F" : "M"},${40 + ((i * 7) % 31)}`);
  return `${lines.join("\n")}\n`;
}
function visits() {
  const lines = ["pid,when,pain,comment"];
  for (let i = 1; i <= 48; i++) {
    ["week 12", "baseline", "week 4"].forEach((code, at) => lines.push(`P${100 + i},${code},${20 + ((i * 13 + at * 5) % 60)},`));
  }
  lines.push("P105,unscheduled,44,came by chance");
  return `${lines.join("\n")}\n`;
}

before(async () => {
  place = temporary();
  program = start("open", "--folder", place.folder);
  browser = await browse();
  address = await program.address;
  page = await openPage(browser, address);
});
after(async () => {
  await browser?.close();
  await program?.stop();
  place?.remove();
});

const path = (name) => page.locator(`[data-path="${name}"]`).first();
const plan = async () => JSON.parse(await page.locator(".plan-side pre").innerText());
const card = (name) => page.locator(`section[data-file="${name}"]`);

async function drop(where, files) {
  const transfer = await page.evaluateHandle((given) => {
    const data = new DataTransfer();
    for (const [name, text] of given) data.items.add(new File([text], name));
    return data;
  }, Object.entries(files));
  await page.dispatchEvent(where, "drop", { dataTransfer: transfer });
}

test("two files dropped at once are listed with what was recognised", async () => {
  await drop(".drop", { "visits.csv": visits(), "people.csv": people() });
  await page.waitForSelector(".plan-form");
  assert.match(await card("people.csv").innerText(), /48 records, 4 columns, 48 participants, has every participant/);
  assert.match(await card("visits.csv").innerText(), /145 records, 4 columns, 48 participants, 48 of them in people\.csv/);
  assert.equal(await card("visits.csv").locator("select").first().inputValue(), "visit");
  assert.equal(await card("people.csv").locator("select").first().inputValue(), "participant");
  const guessed = await plan();
  assert.deepEqual(guessed.files.map((file) => [file.id, file.layout, file.participant]), [["people", "participant", "pid"], ["visits", "visit", "pid"]]);
  assert.deepEqual(guessed.files[1].codes, ["baseline", "week 4", "week 12"]);
  assert.equal(guessed.arm.column, "people.arm");
  assert.deepEqual(guessed.outcomes[0].visits, [{ label: "Baseline", column: "visits.pain@baseline" },
    { label: "4 weeks", column: "visits.pain@week 4" }, { label: "12 weeks", column: "visits.pain@week 12" }]);
  assert.deepEqual(await lookFaults(page, 12), []);
  await picture(page, "several-files");
});

test("choices of columns show file, column and visit", async () => {
  const options = await path("outcomes[0].visits[0].column").locator("option").allInnerTexts();
  assert.ok(options.includes("visits.pain@week 4") && options.includes("people.age"), options.join(" "));
  assert.ok(!options.includes("visits.pain"));
});

test("another layout, other visits: the form is guessed again, what was typed is kept", async () => {
  await path("title").fill("Walks");
  await card("visits.csv").locator("select").first().selectOption("participant");
  await page.waitForFunction(() => JSON.parse(document.querySelector(".plan-side pre").innerText).files[1].layout === "participant");
  assert.equal((await plan()).title, "Walks");
  await card("visits.csv").locator("select").first().selectOption("visit");
  await page.waitForFunction(() => JSON.parse(document.querySelector(".plan-side pre").innerText).files[1].layout === "visit");
  await path("files[1].codes").fill("baseline, week 12");
  await path("files[1].codes").press("Tab");
  await page.waitForFunction(() => JSON.parse(document.querySelector(".plan-side pre").innerText).files[1].codes.length === 2);
  assert.deepEqual((await plan()).outcomes[0].visits.map((visit) => visit.label), ["Baseline", "12 weeks"]);
});

test("a file can be added and taken out; one that is no table is refused with its sentence", async () => {
  await drop(".plan-side", { "labs.csv": "pid,crp\nP101,3.1\nP102,2.2\nP103,4.0\n" });
  await card("labs.csv").waitFor();
  assert.equal((await plan()).files.length, 3);
  assert.equal((await plan()).files[1].codes.length, 2); // what was said still stands
  await card("labs.csv").locator("button").click();
  await page.waitForFunction(() => !document.querySelector('section[data-file="labs.csv"]'));
  assert.equal((await plan()).files.length, 2);
  await drop(".plan-side", { "broken.csv": 'a,b\n"1,2\n' });
  await page.waitForSelector("#plan-trouble:not(:empty)");
  assert.match(await page.locator("#plan-trouble").innerText(), /broken\.csv/);
});

test("the study is made from both and has its effect", async () => {
  await path("title").fill("Walks");
  await path("blinding").selectOption("unblinded");
  await page.fill("[name=who]", "Ada Quay");
  await page.fill("[name=role]", "data manager");
  await page.click('[data-key="make"]');
  await page.waitForSelector("#agenda .items");
  await settled(page);
  assert.ok(existsSync(join(place.folder, "people.study")));
  assert.equal((await agenda(page)).title, "Walks");
  const effect = await json(page, "/exhibit/effect.json");
  assert.equal(effect.contrasts[0].estimates[0].status, "ok");
});

// --- one file by keyboard alone -------------------------------------------------------------------------------------------

async function tabTo(key) {
  for (let i = 0; i < 400; i++) {
    if ((await focused(page)).key === key) return;
    await page.keyboard.press("Tab");
  }
  assert.fail(`Tab never came to ${key}`);
}

test("a study from one file with a row for each visit, by keyboard alone", async () => {
  await page.evaluate(() => fetch("/close", { method: "POST", headers: { "Content-Type": "application/json" }, body: "{}" }));
  await page.goto(`${new URL(address).origin}/`);
  await page.waitForSelector(".studies");
  const file = join(place.folder, "long.csv");
  const arms = new Map(people().trim().split("\n").slice(1).map((line) => [line.split(",")[0], line.split(",")[1]]));
  writeFileSync(file, visits().trim().split("\n").map((line, at) => `${line},${at ? arms.get(line.split(",")[0]) : "arm"}`).join("\n"));
  const choosing = page.waitForEvent("filechooser");
  await tabTo("choose-export");
  await page.keyboard.press("Enter");
  await (await choosing).setFiles(file);
  await page.waitForSelector(".plan-form");
  assert.equal((await plan()).arm.column, "long.arm@baseline");
  await tabTo("files[0].layout");
  await page.keyboard.press("ArrowUp"); // one row for each participant
  await page.waitForFunction(() => !JSON.parse(document.querySelector(".plan-side pre").innerText).files);
  assert.equal((await focused(page)).key, "files[0].layout");
  await page.keyboard.press("ArrowDown");
  await page.waitForFunction(() => JSON.parse(document.querySelector(".plan-side pre").innerText).files);
  await tabTo("title");
  await page.keyboard.press("Control+A");
  await page.keyboard.type("Long");
  await tabTo("make");
  await page.keyboard.press("Enter");
  await page.waitForSelector("#agenda .items");
  await settled(page);
  assert.equal((await agenda(page)).title, "Long");
});

test("nothing was asked of another host and the page had no fault", () => {
  assert.deepEqual(page.watch.elsewhere, []);
  assert.deepEqual(page.watch.faults, []);
});
