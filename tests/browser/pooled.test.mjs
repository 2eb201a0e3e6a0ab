// SPDX-License-Identifier: GPL-3.0-or-later
// The page of a study whose arms are pooled: what may not be shown yet refuses with a sentence and a way on; lifting the
// blinding step by step is a decision, and the screen follows.
import assert from "node:assert/strict";
import { execFileSync } from "node:child_process";
import { readFileSync, writeFileSync } from "node:fs";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { agenda, browse, goTo, json, lookFaults, openPage, picture, root, settled, start, temporary } from "./program.mjs";

let place, program, browser, page;

before(async () => {
  place = temporary();
  const maker = start("demo", "--folder", place.folder);
  await maker.address;
  await maker.stop();
  const plan = JSON.parse(readFileSync(join(place.folder, "plan.json"), "utf8"));
  writeFileSync(join(place.folder, "pooled.json"), JSON.stringify({ ...plan, blinding: "pooled" }));
  const study = join(place.folder, "pooled.study");
  execFileSync(join(root, "build", "evenhand"), ["load", join(place.folder, "export.csv"), "--plan", join(place.folder, "pooled.json"), "--study", study, "--by", "Ada Quay, data manager"]);
  program = start("open", study);
  browser = await browse();
  page = await openPage(browser, await program.address);
  await settled(page);
});
after(async () => {
  await browser?.close();
  await program?.stop();
  place?.remove();
});

const text = (selector) => page.locator(selector).first().innerText();

test("POOLED stands on top, and every exhibit is shown as one arm or refused with a sentence", async () => {
  assert.equal(await text("#top .blinding"), "POOLED");
  let refused = 0;
  for (const { exhibits } of (await agenda(page)).items) {
    for (const exhibit of exhibits) {
      await goTo(page, `#${exhibit.name}`);
      const sentences = await page.locator(".failing .sentence").allInnerTexts();
      assert.equal(sentences.length > 0, exhibit.refused !== null, `${exhibit.name} is refused as its agenda says`);
      if (sentences.length) {
        refused++;
        assert.match(sentences[0], /pooled/i);
        await picture(page, "pooled-refused");
      }
      assert.deepEqual(await lookFaults(page, 12.9), []);
    }
  }
  assert.ok(refused > 0);
  assert.deepEqual((await json(page, "/exhibit/change-by-arm.json")).groups.map((group) => group.arm), ["all"]);
});

test("the arms are shown as letters after a decision, and by name after another", async () => {
  for (const [to, shown] of [["coded", "CODED"], ["unblinded", "UNBLINDED"]]) {
    await goTo(page, "#decisions");
    await page.click(`[data-key="unblind-${to}"]`);
    const form = page.locator("dialog form.decision");
    if (await form.locator("[name=who]").count()) {
      await form.locator("[name=who]").fill("Ada Quay");
      await form.locator("[name=role]").fill("data manager");
    }
    await form.locator("[name=reason]").fill("Agreed at the meeting");
    await form.locator("button[type=submit]").click();
    await page.waitForFunction((word) => document.querySelector("#top .blinding").textContent === word, shown);
    await goTo(page, "#effect");
    assert.equal(await page.locator(".failing").count(), 0);
    assert.match(await text("#main .lead"), to === "coded" ? /B minus A/ : /Walking group/);
  }
  await goTo(page, "#decisions");
  assert.equal(await page.locator('[data-key^="unblind-"]').count(), 0);
});

test("nothing was asked of another host and the page had no fault", () => {
  assert.deepEqual(page.watch.elsewhere, []);
  assert.deepEqual(page.watch.faults, []);
});
