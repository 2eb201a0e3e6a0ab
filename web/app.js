// SPDX-License-Identifier: GPL-3.0-or-later
// The page: opens the study, and redraws what the address or the record has changed.
import * as address from "./address.js";
import { drawAgenda, drawTop } from "./agenda.js";
import { listen, mark, showExhibit } from "./exhibit.js";
import { listenKeys, showKeys } from "./keys.js";
import { $, button, fill, make, restoreFocus } from "./page.js";
import { showParticipant } from "./participant.js";
import { drawFoot } from "./record.js";
import { showStart } from "./start.js";
import { study } from "./study.js";

async function draw(again = false) {
  if (!study.agenda?.study) return;
  let place = address.read();
  if (!place.exhibit) {
    address.slip(address.write({ ...place, exhibit: study.exhibits()[0].name }));
    place = address.read();
  }
  document.body.classList.toggle("meeting", place.meeting);
  drawTop();
  drawAgenda(place, showKeys);
  drawFoot(place);
  await Promise.all([showExhibit(place, again), showParticipant(place, again)]);
  mark(place.panel);
}

export async function open() {
  try {
    await study.load();
  } catch (fault) {
    fill($("main"), make("p", { class: "sentence", role: "alert" }, fault.message), make("p", { class: "actions" }, button("Try again", open)));
    return;
  }
  const there = Boolean(study.agenda.study);
  document.body.classList.toggle("first-page", !there);
  if (there) await draw(true);
  else showStart(open);
}

window.addEventListener("hashchange", () => draw());
study.redraw = () => draw(true);
study.addEventListener("deciding", () => study.agenda?.study && drawTop());
$("skip").addEventListener("click", () => restoreFocus(".question", $("main")));
listen();
listenKeys();
open();
