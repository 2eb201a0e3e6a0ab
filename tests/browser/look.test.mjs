// SPDX-License-Identifier: GPL-3.0-or-later
// How every exhibit looks, at a laptop's size and at a meeting room's: no text over text, none cut off, no page wider than
// its window; in the meeting view no text below 25 px (16 to 22 minutes of arc at 4 m on a 65-inch screen: ISO 9241-303,
// figures from memory).
import assert from "node:assert/strict";
import { after, before, test } from "node:test";
import { agenda, browse, focused, goTo, lookFaults, openPage, picture, settled, start } from "./program.mjs";

let program, browser, address;
const sizes = [{ width: 1366, height: 768 }, { width: 1920, height: 1080 }];

before(async () => {
  program = start("demo");
  browser = await browse();
  address = await program.address;
});
after(async () => {
  await browser?.close();
  await program?.stop();
});

// Every exhibit with every value of each of its rows of tabs.
async function screens(page) {
  const found = [];
  for (const item of (await agenda(page)).items) {
    if (!item.exhibits.length) found.push(`#item-${item.number}`);
    for (const { name } of item.exhibits) {
      found.push(`#${name}`);
      await goTo(page, `#${name}`);
      found.push(...await page.evaluate(() => [...document.querySelectorAll("#main .tabs a:not([aria-current])")].map((tab) => tab.getAttribute("href"))));
    }
  }
  return found;
}

for (const size of sizes) {
  test(`every exhibit at ${size.width} x ${size.height}`, async (t) => {
    const page = await openPage(browser, address, size);
    for (const hash of await screens(page)) {
      await t.test(hash, async () => {
        await goTo(page, hash);
        await picture(page, `${size.width}-${hash.slice(1).replace(/[^\w-]+/g, "_")}`);
        assert.deepEqual(await lookFaults(page, 12.9), []);
      });
    }
    await page.context().close();
  });

  test(`a participant's panel at ${size.width} x ${size.height}`, async () => {
    const page = await openPage(browser, address, size);
    const { participant } = await page.evaluate(async () => (await (await fetch("/exhibit/discrepancies.json")).json()).discrepancies.find((one) => one.participant && one.column));
    await goTo(page, `#change-by-arm?panel=${participant}`);
    await page.waitForSelector("#participant");
    await picture(page, `${size.width}-panel`);
    assert.deepEqual(await lookFaults(page), []);
    await page.locator('#panel [data-key^="act-query"]').first().click();
    await picture(page, `${size.width}-panel-query`);
    assert.deepEqual(await lookFaults(page), []);
    await page.context().close();
  });
}

test("the meeting view shows every text at 25 px or more, keeps the caption, and pins note and next open item", async (t) => {
  const page = await openPage(browser, address, sizes[1]);
  for (const hash of await screens(page)) {
    await t.test(hash, async () => {
      const meeting = `${hash}${hash.includes("?") ? "&" : "?"}meeting=1`;
      await goTo(page, meeting);
      await page.waitForSelector("body.meeting #foot:not([hidden])");
      await settled(page);
      await picture(page, `meeting-${hash.slice(1).replace(/[^\w-]+/g, "_")}`);
      assert.deepEqual(await lookFaults(page, 25), []);
      const large = await page.evaluate(() => [...document.querySelectorAll("#main .large")].map((one) => Number.parseFloat(getComputedStyle(one).fontSize)));
      for (const px of large) assert.ok(px >= 34, `a key number is ${px} px`);
      const caption = page.locator("#main figcaption").first();
      if (await caption.count()) assert.ok(await caption.isVisible());
      assert.match(await page.locator("#foot").innerText(), /Next open item|No (other )?item is open/);
    });
  }
  await page.keyboard.press("Escape");
  await page.waitForSelector("body:not(.meeting)");
  assert.ok(await focused(page));
  await page.context().close();
});

test("on paper the agenda, the panel and every button give way; the line on top and the exhibit stay", async () => {
  const page = await openPage(browser, address, sizes[0]);
  await goTo(page, "#effect");
  await page.emulateMedia({ media: "print" });
  for (const selector of ["#agenda", "#panel", ".saves", ".concluded button"]) {
    for (const element of await page.locator(selector).all()) assert.equal(await element.isVisible(), false, `${selector} is not printed`);
  }
  for (const selector of ["#top h1", "#top .blinding", ".question", "svg.figure"]) assert.ok(await page.locator(selector).first().isVisible(), `${selector} is printed`);
  await picture(page, "print-effect");
  await page.context().close();
});
