// SPDX-License-Identifier: GPL-3.0-or-later
// Where no study is open: an export is dropped, what its columns mean is said on the form, the plan is saved as a file, the
// study is made and shown; faults stand where they belong; a study that is there is opened; a plan file is taken.
import assert from "node:assert/strict";
import { existsSync, readFileSync, writeFileSync } from "node:fs";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { agenda, browse, focused, json, lookFaults, openPage, picture, settled, start, temporary } from "./program.mjs";

let place, program, browser, page, address;

// An invented export with other names, three arms, a semicolon, a decimal comma and a code for missing.
function invented() {
  const lines = ["Patient;Treatment;Gender;Age;Weight baseline;Weight week 12;Remark"];
  for (let i = 1; i <= 60; i++) {
    const arm = ["low", "high", "none"][i % 3];
    const base = (70 + (i * 7) % 23 + (i % 10) / 10).toFixed(1).replace(".", ",");
    const end = i % 11 === 0 ? "-99" : (69 + (i * 5) % 21 + (i % 7) / 10).toFixed(1).replace(".", ",");
    lines.push(`P${String(i).padStart(3, "0")};${arm};${i % 2 ? "female" : "male"};${30 + (i * 3) % 40};${base};${end};${i === 5 ? "came late" : ""}`);
  }
  return `${lines.join("\n")}\n`;
}

before(async () => {
  place = temporary();
  writeFileSync(join(place.folder, "weights.csv"), invented());
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

const text = (selector) => page.locator(selector).first().innerText();
const path = (name) => page.locator(`[data-path="${name}"]`).first();
const plan = async () => JSON.parse(await page.locator(".plan-side pre").innerText());

async function drop(file) {
  const bytes = readFileSync(file).toString("base64");
  const transfer = await page.evaluateHandle(([content, name]) => {
    const data = new DataTransfer();
    data.items.add(new File([Uint8Array.from(atob(content), (letter) => letter.charCodeAt(0))], name));
    return data;
  }, [bytes, file.split("/").at(-1)]);
  await page.dispatchEvent(".drop, .plan-side p", "drop", { dataTransfer: transfer });
}

test("the first page lists studies, takes an export and says what this is for", async () => {
  assert.match(await text("#main"), /Drop an export here/);
  assert.match(await text(".care"), /qualified to analyse trials/);
  assert.deepEqual(await lookFaults(page, 12.9), []);
  await picture(page, "first-page");
});

test("a file that is no table is refused with its sentence, and the page stays", async () => {
  writeFileSync(join(place.folder, "broken.csv"), 'a,b\n"1,2\n');
  await drop(join(place.folder, "broken.csv"));
  await page.waitForSelector(".trouble:not(:empty)");
  assert.ok((await text(".trouble")).length > 20);
  assert.equal(await page.locator(".plan-form").count(), 0);
});

test("a dropped export becomes a form that starts from guesses", async () => {
  await drop(join(place.folder, "weights.csv"));
  await page.waitForSelector(".plan-form");
  const guessed = await plan();
  assert.equal(guessed.participant, "Patient");
  assert.equal(guessed.arm.column, "Treatment");
  assert.deepEqual(guessed.arm.levels.map((level) => level.code).sort(), ["high", "low", "none"]);
  assert.equal(guessed.outcomes.length, 1);
  assert.deepEqual(guessed.outcomes[0].visits.map((visit) => visit.column), ["Weight baseline", "Weight week 12"]);
  assert.deepEqual(await lookFaults(page, 12), []);
  await picture(page, "plan-form");
});

test("what is missing is said at the place it concerns", async () => {
  await path("title").fill("");
  await page.click('[data-key="make"]');
  await page.waitForSelector(".fault");
  assert.equal((await focused(page)).key, "title");
  assert.match(await text(".fault"), /title/);
  await picture(page, "plan-form-fault");
});

test("the form changes the plan as it is shown", async () => {
  await path("title").fill("Weights after counselling");
  await path("outcomes[0].label").fill("Body weight");
  await path("outcomes[0].id").fill("weight");
  await path("outcomes[0].unit").fill("kg");
  await path("outcomes[0].better").selectOption("lower");
  await page.locator('[data-key="outcomes[0].plausible.0"]').fill("40");
  await page.locator('[data-key="outcomes[0].plausible.1"]').fill("150");
  await path("outcomes[0].important_difference").fill("2");
  const codes = (await plan()).arm.levels.map((level) => level.code);
  await page.check(`[data-key="arm.reference.${codes.indexOf("none")}"]`);
  await path("missing_codes").fill("-99");
  await path("blinding").selectOption("coded");
  const age = (await plan()).covariates.findIndex((covariate) => covariate.column === "Age");
  assert.ok(age >= 0, "age was guessed to be a covariate");
  await path(`covariates[${age}].bands`).fill("40, 55");
  await page.locator(`[data-key="adjust_for.${(await plan()).covariates[age].id}"]`).check();
  const made = await plan();
  assert.equal(made.title, "Weights after counselling");
  assert.deepEqual(made.outcomes[0].plausible, [40, 150]);
  assert.equal(made.outcomes[0].unit, "kg");
  assert.deepEqual(made.missing_codes, ["-99"]);
  assert.deepEqual(made.covariates[age].bands, [40, 55]);
  assert.equal(made.arm.levels.filter((level) => level.reference).length, 1);
  assert.equal(made.arm.levels.find((level) => level.reference).code, "none");
});

test("the plan is saved as a file", async () => {
  const waiting = page.waitForEvent("download");
  await page.click('[data-key="save-plan"]');
  const download = await waiting;
  assert.match(download.suggestedFilename(), /plan\.json$/);
  const file = join(place.folder, "saved-plan.json");
  await download.saveAs(file);
  assert.deepEqual(JSON.parse(readFileSync(file, "utf8")), await plan());
});

test("a fault the program finds in the plan stands at its field", async () => {
  await path("outcomes[0].visits[0].label").fill("Week 12");
  await path("outcomes[0].visits[1].label").fill("Week 12");
  await page.fill("[name=who]", "Ada Quay");
  await page.fill("[name=role]", "data manager");
  await page.click('[data-key="make"]');
  await page.waitForSelector("#plan-trouble:not(:empty)");
  await page.waitForFunction(() => document.querySelector('section[data-at^="outcomes"] .fault, section[data-at^="outcomes"] ~ .fault'));
  await path("outcomes[0].visits[0].label").fill("Baseline");
});

test("the study is made, kept in the folder and shown with its agenda", async () => {
  await page.click('[data-key="make"]');
  await page.waitForSelector("#agenda .items");
  await settled(page);
  assert.ok(existsSync(join(place.folder, "weights.study")));
  const made = await agenda(page);
  assert.equal(made.title, "Weights after counselling");
  assert.equal(await text("#top h1"), "Weights after counselling");
  assert.equal(await text("#top .blinding"), "CODED");
});

test("its decimal commas are settled by one decision for each column, and the effect is there", async () => {
  assert.notEqual((await json(page, "/exhibit/effect.json")).contrasts[0].estimates[0].status, "ok");
  for (const column of ["Weight baseline", "Weight week 12"]) {
    await page.click('[data-key="agenda-2"]');
    await settled(page);
    const { discrepancies } = await json(page, "/exhibit/discrepancies.json");
    const found = discrepancies.find((one) => one.column === column && one.state === "open" && one.proposal?.kind === "number-format");
    const item = page.locator(`[data-key="item-${found.id}"]`);
    if ((await item.getAttribute("aria-expanded")) !== "true") await item.click();
    await page.click('[data-key="do-a"]');
    await page.fill("form.decision [name=reason]", "The export writes a decimal comma");
    const { version } = await agenda(page);
    await page.click("form.decision button[type=submit]");
    await page.waitForFunction((before) => document.querySelector("#top .facts").innerText.includes(`after decision ${before + 1}`), version);
    await settled(page);
  }
  const effect = await json(page, "/exhibit/effect.json");
  assert.equal(effect.contrasts.length, 2);
  assert.equal(effect.contrasts[0].estimates[0].status, "ok");
  await page.click('[data-key="agenda-6"]');
  await settled(page);
  assert.equal(await page.locator(".failing").count(), 0);
  await picture(page, "three-arms-effect");
  assert.deepEqual(await lookFaults(page, 12.9), []);
});

test("it stands in the list afterwards and opens again; a plan file fills the form", async () => {
  await page.evaluate(() => fetch("/close", { method: "POST", headers: { "Content-Type": "application/json" }, body: "{}" }));
  await page.goto(`${new URL(address).origin}/`);
  await page.waitForSelector(".studies");
  assert.match(await text(".studies"), /weights\.study/);
  await page.setInputFiles("#export", join(place.folder, "weights.csv"));
  await page.waitForSelector(".plan-form");
  await page.setInputFiles("#plan-file", join(place.folder, "saved-plan.json"));
  await page.waitForFunction(() => document.querySelector('[data-path="title"]').value === "Weights after counselling");
  await page.click('[data-key="another"]');
  await page.waitForSelector(".studies");
  await page.click('[data-key="open-weights.study"]');
  await page.waitForSelector("#agenda .items");
  await settled(page);
  assert.equal(await text("#top h1"), "Weights after counselling");
});

test("nothing was asked of another host and the page had no fault", () => {
  assert.deepEqual(page.watch.elsewhere, []);
  assert.deepEqual(page.watch.faults, []);
});
