// SPDX-License-Identifier: GPL-3.0-or-later
// The keyboard: one table, from which the list of keys on the page is made too.
import * as address from "./address.js";
import { doubtfulShown, keys as doubtful } from "./doubtful.js";
import { baselineBeside, tabBy } from "./exhibit.js";
import { $, make, openDialog, say, writing } from "./page.js";
import { closeParticipant } from "./participant.js";
import { study } from "./study.js";

function exhibitBy(step) {
  const place = address.read();
  const list = study.exhibits();
  let at = list.findIndex((exhibit) => exhibit.name === place.exhibit);
  if (at < 0) {
    const item = Number(place.exhibit.match(/^item-(\d)$/)?.[1] ?? 0);
    const next = list.findIndex((exhibit) => exhibit.item.number > item);
    at = (next < 0 ? list.length : next) - (step > 0 ? 1 : 0);
  }
  const to = list[at + step];
  if (!to) {
    say(step > 0 ? "This is the last exhibit." : "This is the first exhibit.");
    return;
  }
  address.go(address.write({ ...place, exhibit: to.name, args: {}, panel: "", cell: "", show: "", at: "" }));
}

function itemBy(step) {
  const place = address.read();
  const { items } = study.agenda;
  const here = study.exhibit(place.exhibit)?.item.number ?? Number(place.exhibit.match(/^item-(\d)$/)?.[1] ?? 1);
  const item = items.find((one) => one.number === here + step);
  if (!item) return;
  address.go(address.write({ ...place, exhibit: item.exhibits[0]?.name ?? `item-${item.number}`, args: {}, panel: "", cell: "", show: "", at: "" }));
}

function escape() {
  const place = address.read();
  if (place.panel) closeParticipant();
  else if (place.meeting) address.go(address.changed({ meeting: false }));
  else say("");
}

const table = [
  { keys: ["PageDown"], words: "Page down", says: "next exhibit", act: () => exhibitBy(1) },
  { keys: ["PageUp"], words: "Page up", says: "previous exhibit", act: () => exhibitBy(-1) },
  { keys: ["ArrowDown"], words: "↓", says: "next item of the agenda", act: () => itemBy(1) },
  { keys: ["ArrowUp"], words: "↑", says: "previous item of the agenda", act: () => itemBy(-1) },
  { keys: ["ArrowRight"], words: "→", says: "next tab of the exhibit", act: () => tabBy(1) },
  { keys: ["ArrowLeft"], words: "←", says: "previous tab of the exhibit", act: () => tabBy(-1) },
  { keys: ["b"], words: "b", says: "baseline beside follow-up, where the exhibit has it, and back", act: baselineBeside },
  { keys: ["m"], words: "m", says: "meeting view, and back", act: () => address.go(address.changed({ meeting: !address.read().meeting })) },
  { keys: ["?"], words: "?", says: "this list", act: () => showKeys() },
  { keys: ["Escape"], words: "Escape", says: "closes what is open: a form, the participant, the meeting view", act: escape },
];
const others = [
  ["Tab", "from one mark, button or link to the next"],
  ["Enter", "on a mark, cell or row: that participant"],
];
const settling = [
  ["n", "next discrepancy"], ["p", "previous discrepancy"], ["a", "accept the proposal"], ["c", "confirm as recorded"],
  ["q", "raise a query"], ["s", "set missing"], ["e", "correct"], ["r", "enter the site’s answer to a query"], ["l", "later"], ["Enter", "the participant"],
];

export function showKeys() {
  const rows = (list) => make("dl", { class: "key-list" }, list.map(([key, says]) => make("div", {}, make("dt", {}, make("kbd", {}, key)), make("dd", {}, says))));
  openDialog("Keys", make("div", { class: "key-lists" },
    make("section", {}, make("h3", {}, "Everywhere"), rows([...table.map((row) => [row.words, row.says]), ...others])),
    make("section", {}, make("h3", {}, "In the list of doubtful values"), rows(settling))));
}

export function listenKeys() {
  document.addEventListener("keydown", (event) => {
    if (event.defaultPrevented || event.ctrlKey || event.metaKey || event.altKey || !study.agenda?.study) return;
    if ($("dialog").open || writing(event.target)) return;
    if (event.target instanceof Element && event.target.matches("input[type=radio]") && event.key.startsWith("Arrow")) return;
    if (doubtfulShown() && doubtful[event.key] && event.key !== "Enter") {
      event.preventDefault();
      doubtful[event.key]();
      return;
    }
    const row = table.find((one) => one.keys.includes(event.key));
    if (row) {
      event.preventDefault();
      row.act();
    }
  });
}
