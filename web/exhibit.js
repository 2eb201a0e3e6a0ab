// SPDX-License-Identifier: GPL-3.0-or-later
// One exhibit at a time: fetched as a fragment, its tabs and marks brought to life, its notes and files below it.
import * as address from "./address.js";
import { makeDoubtful } from "./doubtful.js";
import { $, button, fill, focusKey, make, restoreFocus, say } from "./page.js";
import { openParticipant } from "./participant.js";
import { addReversals, blindingPart, drawNotes, scalePart } from "./record.js";
import * as server from "./server.js";
import { study } from "./study.js";

let shown = ""; // the question on the screen, with the version it was asked of
let running = null; // what would stop the request on its way
let lastTabs = ""; // the row of tabs last used: left and right go on in it

const signature = (place) => `${study.agenda.version} ${study.agenda.blinding} ${address.question(place)} ${place.show}`;

export async function showExhibit(place, again = false) {
  const main = $("main");
  const entry = study.exhibit(place.exhibit);
  const wanted = signature(place);
  if (wanted === shown && !again) {
    for (const tab of main.querySelectorAll(".tabs a")) rewrite(tab);
    return;
  }
  running?.abort();
  if (!entry) {
    shown = wanted;
    fill(main, absent(place));
    return;
  }
  const before = main.querySelector(".exhibit")?.dataset.exhibit;
  const same = before === entry.name;
  const focus = main.contains(document.activeElement) ? focusKey(document.activeElement) ?? ".question" : null;
  const control = new AbortController();
  running = control;
  main.setAttribute("aria-busy", "true");
  const waiting = wait(entry, control);
  try {
    const article = entry.name === "discrepancies" ? await makeDoubtful(entry, place, control.signal)
      : await fetchArticle(place, control.signal);
    if (running !== control) return;
    shown = wanted;
    await place_article(main, article, entry, place);
    if (!same) window.scrollTo(0, 0);
    if (focus) restoreFocus(same ? focus : ".question", main.querySelector(".question"));
    if (!same) say("");
  } catch (fault) {
    if (running !== control) return;
    shown = wanted;
    fill(main, failing(entry, place, fault.name === "AbortError" ? new Error("Stopped before it was done.") : fault));
    if (focus) restoreFocus(".question");
  } finally {
    clearInterval(waiting);
    if (running === control) {
      running = null;
      main.removeAttribute("aria-busy");
    }
  }
}

// After a moment of waiting the page says what it waits for, how long, and offers to stop.
function wait(entry, control) {
  const since = performance.now();
  let line = null;
  return setInterval(() => {
    const seconds = Math.floor((performance.now() - since) / 1000);
    if (seconds < 1) return;
    if (!line) {
      line = make("p", { class: "wait", role: "status" }, make("span", {}), " ", button("Stop", () => control.abort()));
      $("main").prepend(line);
    }
    line.firstChild.textContent = `Computing ${entry.number} for ${seconds} s. The rest of the page stays usable.`;
  }, 250);
}

async function fetchArticle(place, signal) {
  const holder = document.createElement("template");
  holder.innerHTML = await server.text(address.question(place), signal);
  const article = holder.content.querySelector("article") ?? make("article", { class: "exhibit" });
  return document.adoptNode(article);
}

function head(entry, number, title) {
  return [make("p", { class: "number" }, number), make("h2", { class: "question", tabindex: "-1" }, title)];
}

function failing(entry, place, fault) {
  return make("article", { class: "exhibit failing", "data-exhibit": entry.name }, head(entry, entry.number, entry.title),
    make("p", { class: "sentence", role: "alert" }, fault.message),
    make("p", { class: "actions" },
      fault.status === 400 || fault.status === 404 ? make("a", { href: address.write({ ...place, args: {} }) }, "Show it without these choices") : null,
      fault.status === 403 ? make("a", { href: "#decisions" }, "Blinding stands in item 9") : null,
      button("Try again", () => showExhibit(address.read(), true), { "data-key": "again" })));
}

// An item whose exhibits belong to a later version, or an address of nothing.
function absent(place) {
  const item = study.agenda.items.find((one) => place.exhibit === `item-${one.number}`);
  return make("article", { class: "exhibit failing" },
    head(null, item ? String(item.number) : "", item ? item.name : "This address leads to no exhibit"),
    make("p", { class: "sentence" }, item ? item.later || "This item has no exhibit yet in this version of the program." : `No exhibit is called “${place.exhibit}”.`),
    make("p", { class: "actions" }, make("a", { href: address.write({ exhibit: study.exhibits()[0].name, args: {} }) }, "Go to the first exhibit")));
}

function rewrite(tab) {
  const { argument } = tab.closest(".tabs").dataset;
  if (argument === "show") tab.href = address.changed({ show: tab.dataset.value, at: "" });
  else if (argument && tab.dataset.value !== undefined) tab.href = address.withArgument(argument, tab.dataset.value);
}

async function place_article(main, article, entry, place) {
  const question = article.querySelector(".question");
  if (question) question.tabIndex = -1;
  article.querySelector(".number")?.append(make("span", { class: "whereabouts" }, whereabouts(entry)));
  const rows = [...article.querySelectorAll(".tabs")];
  if (rows.length > 1) {
    rows[0].before(make("div", { class: "tab-rows" }));
    article.querySelector(".tab-rows").append(...rows);
  }
  for (const row of rows) sayWhich(row);
  for (const tab of article.querySelectorAll(".tabs a")) rewrite(tab);
  for (const table of article.querySelectorAll("table.table")) {
    if (!table.parentElement.matches(".scroll")) {
      const box = make("div", { class: "scroll", tabindex: "0", role: "region", "aria-label": table.caption?.textContent || "Table" });
      table.replaceWith(box);
      box.append(table);
    }
  }
  const svg = article.querySelector("svg.figure");
  if (svg) article.classList.add("with-figure");
  const notes = make("section", { class: "concluded", "aria-label": "What the team concluded" });
  fill(main, article,
    entry.item.number === 4 ? scalePart(place, article) : null,
    entry.name === "decisions" ? blindingPart() : null,
    notes,
    saves(entry, place, Boolean(svg)),
    entry.item.number === 1 && entry.item.exhibits[0].name === entry.name && study.agenda.care ? make("aside", { class: "care", "aria-label": "Words of care" }, study.agenda.care) : null);
  fitBoxes(article);
  mark(place.panel);
  drawNotes(notes, entry.name);
  if (entry.name === "decisions") await addReversals(article).catch((fault) => say(fault.message));
}

// Where values alone would not say what they choose, words stand before them; the visits of an outcome share its name.
const before = { arm: "Against the reference:", order: "In order of:" };
function sayWhich(row) {
  const words = before[row.dataset.argument];
  if (words) row.prepend(make("span", {}, words));
  if (row.dataset.argument !== "variable") return;
  let group = null;
  let last = null;
  for (const tab of [...row.querySelectorAll("a")]) {
    const outcome = study.outcomeOf(tab.textContent);
    const visit = outcome && tab.textContent.slice(outcome.label.length + 2);
    if (visit) {
      if (outcome !== last) tab.before((group = make("span", { class: "group" }, make("span", { "aria-hidden": "true" }, outcome.label))));
      tab.setAttribute("aria-label", tab.textContent);
      tab.textContent = visit;
      group.append(tab);
    }
    last = outcome;
  }
}

// A box that need not scroll is no stop for the keyboard.
function fitBoxes(article) {
  for (const box of article.querySelectorAll(".scroll")) {
    const scrolls = () => box.scrollWidth > box.clientWidth + 1;
    const fit = () => (scrolls() ? box.setAttribute("tabindex", "0") : box.removeAttribute("tabindex"));
    fit();
    box.closest("details")?.addEventListener("toggle", fit);
  }
}

function whereabouts(entry) {
  const at = entry.item.exhibits.findIndex((one) => one.name === entry.name) + 1;
  return `item ${entry.item.number} of ${study.agenda.items.length}, exhibit ${at} of ${entry.item.exhibits.length}`;
}

function saves(entry, place, figure) {
  const file = (kind) => `${entry.name}-after-decision-${study.agenda.version}${kind}`;
  return make("p", { class: "saves" }, "Save this exhibit: ",
    figure ? [make("a", { href: address.question(place, ".svg"), download: file(".svg") }, "SVG"), " ", button("PNG", () => savePng(entry, place, file(".png")), { class: "quiet", "data-key": "png" }), " "] : null,
    make("a", { href: address.question(place, ".csv"), download: file(".csv") }, "CSV"), " ",
    make("a", { href: address.question(place, ".json"), download: file(".json") }, "JSON"), " ",
    button("Print", () => window.print(), { class: "quiet", "data-key": "print" }));
}

// Drawn from the same bytes as the SVG, at twice its size, on paper.
async function savePng(entry, place, name) {
  try {
    const image = new Image();
    image.src = address.question(place, ".svg");
    await image.decode();
    const canvas = make("canvas");
    canvas.width = image.naturalWidth * 2;
    canvas.height = image.naturalHeight * 2;
    const pen = canvas.getContext("2d");
    pen.fillStyle = "#FBFAF7";
    pen.fillRect(0, 0, canvas.width, canvas.height);
    pen.drawImage(image, 0, 0, canvas.width, canvas.height);
    const blob = await new Promise((resolve) => canvas.toBlob(resolve, "image/png"));
    const link = make("a", { href: URL.createObjectURL(blob), download: name });
    link.click();
    setTimeout(() => URL.revokeObjectURL(link.href), 10000);
  } catch {
    say(`The picture of ${entry.number} could not be made; save it as SVG instead.`);
  }
}

// --- participants: the same one everywhere on the screen -------------------------------------------------------------

let marked = "";
export function mark(participant) {
  for (const element of document.querySelectorAll(".same")) element.classList.remove("same");
  marked = participant;
  if (!participant) return;
  for (const element of document.querySelectorAll(`[data-participant="${CSS.escape(participant)}"]`)) element.classList.add("same");
}

export function listen() {
  const of = (target) => (target instanceof Element ? target.closest("[data-participant]") : null);
  const point = (event) => {
    const element = of(event.target);
    const participant = element?.dataset.participant ?? address.read().panel;
    if (participant !== marked) mark(participant);
  };
  document.addEventListener("pointerover", point);
  document.addEventListener("focusin", point);
  $("main").addEventListener("click", (event) => {
    const element = of(event.target);
    if (element && !event.target.closest("a, button.item")) openParticipant(element.dataset.participant, element.dataset.column, element);
    const tabs = event.target.closest?.(".tabs");
    if (tabs) lastTabs = tabs.dataset.argument;
  });
  $("main").addEventListener("keydown", (event) => {
    const element = of(event.target);
    if (element === event.target && !element.matches("a, button") && (event.key === "Enter" || event.key === " ")) {
      event.preventDefault();
      openParticipant(element.dataset.participant, element.dataset.column, element);
    }
  });
}

// --- what the keys do here -------------------------------------------------------------------------------------------

export function tabBy(step) {
  const rows = [...$("main").querySelectorAll(".tabs")];
  const row = document.activeElement?.closest?.(".tabs") ?? rows.find((one) => one.dataset.argument === lastTabs) ??
    rows.find((one) => one.dataset.argument === "by") ?? rows[0];
  if (!row) return false;
  const tabs = [...row.querySelectorAll("a")];
  const at = tabs.findIndex((tab) => tab.getAttribute("aria-current"));
  const next = tabs[at + step];
  lastTabs = row.dataset.argument;
  if (next) {
    if (row.contains(document.activeElement)) next.focus();
    next.click();
  }
  return true;
}

// Baseline beside follow-up: the tab that shows it, or the exhibit of the same item that does, and back.
export function baselineBeside() {
  const tabs = [...$("main").querySelectorAll(".tabs a")];
  const tab = tabs.find((one) => one.dataset.key === "b" || /baseline/i.test(one.dataset.value ?? ""));
  if (tab) {
    const { argument } = tab.closest(".tabs").dataset;
    const first = tab.closest(".tabs").querySelector("a");
    (tab.getAttribute("aria-current") ? first : tab).click();
    return argument !== undefined;
  }
  const here = study.exhibit(address.read().exhibit);
  const other = here?.item.exhibits.find((one) => one.name !== here.name && /pair|before/.test(one.name));
  if (other) address.go(address.write({ ...address.read(), exhibit: other.name, args: carried(address.read().args) }));
  else if (here && /pair|before/.test(here.name)) history.back();
  return Boolean(other);
}

const carried = (args) => (args.outcome ? { outcome: args.outcome } : {});

