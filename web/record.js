// SPDX-License-Identifier: GPL-3.0-or-later
// What is done to the record itself: reversals, unblinding, scales, and the notes of what the team concluded.
import * as address from "./address.js";
import { decisionForm } from "./decide.js";
import { $, button, closeDialog, fill, make, openDialog } from "./page.js";
import { study } from "./study.js";
import { decisionWords, moment } from "./words.js";

const lasting = ["unblind", "lock", "sign"];

export function reverse(decision) {
  const words = decision.words ?? decisionWords(decision);
  openDialog(`Reverse decision ${decision.number}`, decisionForm({
    title: words,
    says: () => "The reversal is an entry of its own; both stay in the record. What the decision changed goes back to what it was before.",
    before: () => words,
    after: () => "as it was before",
    decisions: () => [{ kind: "reverse", number: decision.number }],
    done: closeDialog,
    cancel: closeDialog,
  }));
}

const target = (decision) => decision.reverses ?? (decision.kind === "reverse" ? decision.body?.number ?? Number(decision.from) : null);

// Beside every entry that can be taken back stands a button; the table itself is the server's.
export async function addReversals(article) {
  const decisions = await study.record();
  if (!article.isConnected) return;
  const reversed = new Set(decisions.filter((decision) => decision.kind === "reverse").map(target));
  for (const table of article.querySelectorAll(".tables table, table.table")) {
    if (table.querySelector(".act")) continue;
    table.querySelector("thead tr")?.append(make("th", { scope: "col", class: "act" }, make("span", { class: "unseen" }, "Reverse")));
    for (const row of table.tBodies[0]?.rows ?? []) {
      const number = Number(row.cells[0]?.textContent);
      for (const cell of row.cells) if (/^\d{4}-\d\d-\d\dT[\d:.]+Z$/.test(cell.textContent)) shorten(cell);
      const decision = decisions.find((one) => one.number === number);
      const can = decision && (decision.reversible ?? !lasting.includes(decision.kind)) && !reversed.has(number) && decision.stands !== false;
      row.append(make("td", { class: "act" }, can
        ? button("Reverse", () => reverse(decision), { "data-key": `reverse-${number}`, "aria-label": `Reverse decision ${number}` })
        : reversed.has(number) || decision?.stands === false ? make("small", {}, "reversed") : null));
    }
  }
}

function shorten(cell) {
  cell.title = cell.textContent;
  cell.textContent = moment(cell.title).replace(" UTC", "");
}

const arms = { pooled: "all participants together, no arms", coded: "arms as letters", unblinded: "arms by name" };

export function blindingPart() {
  const now = study.agenda.blinding;
  if (now === "unblinded" || study.agenda.has_arm === false) return null;
  const steps = now === "pooled" ? ["coded", "unblinded"] : ["unblinded"];
  return make("section", { class: "strip", "aria-label": "Blinding" },
    make("p", {}, make("strong", {}, "Blinding. "), `Now ${arms[now]}. Lifting it is a decision that cannot be reversed.`),
    make("p", { class: "actions" }, steps.map((to) => button(to === "coded" ? "Show arms as letters…" : "Unblind…", () => unblind(now, to), { "data-key": `unblind-${to}` }))));
}

function unblind(now, to) {
  openDialog(to === "coded" ? "Show the arms as letters" : "Unblind", decisionForm({
    title: `From ${now.toUpperCase()} to ${to.toUpperCase()}`,
    before: () => arms[now],
    after: () => arms[to],
    says: () => `This cannot be reversed. ${study.agenda.items.find((item) => item.number === 2)?.open ?? ""}${study.agenda.items.find((item) => item.number === 2)?.open ? " among the doubtful values. " : ""}Every decision after this one is marked as taken ${to}.`,
    action: to === "coded" ? "Show the letters and record it" : "Unblind and record it",
    decisions: () => [{ kind: "unblind", to }],
    done: closeDialog,
    cancel: closeDialog,
  }));
}

const scaleWords = { linear: "linear", log10: "log10 (effects as ratios)" };

export function scalePart(place, article) {
  const variable = article.querySelector('.tabs[data-argument="variable"] [aria-current]');
  const outcome = variable ? study.outcomeOf(variable.getAttribute("aria-label") ?? variable.textContent) : study.outcome(place.args.outcome) ?? study.agenda.outcomes[0];
  if (!outcome) return null;
  const now = outcome.scale;
  const choose = (scale) => () => openDialog(`Scale of ${outcome.label}`, decisionForm({
    title: `Analyse ${outcome.label} on the ${scale} scale`,
    before: () => (now ? scaleWords[now] : "as the plan says"),
    after: () => scaleWords[scale],
    says: () => "Change, effect and every later exhibit follow. Choose from all participants together, not from the arms.",
    decisions: () => [{ kind: "scale", outcome: outcome.id, scale }],
    done: closeDialog,
    cancel: closeDialog,
  }));
  return make("section", { class: "strip", "aria-label": "Scale of analysis" },
    make("p", {}, make("strong", {}, `Scale for ${outcome.label}: ${now ? scaleWords[now] : "as planned"}. `), "The team settles it here, before the effect is looked at."),
    make("p", { class: "actions" }, ["linear", "log10"].map((scale) => button(scale === now ? `Keep ${scale}…` : `Take ${scale}…`, choose(scale), { "data-key": `scale-${scale}` }))));
}

// --- what the team concluded ---------------------------------------------------------------------------------------

async function notesOf(name) {
  const decisions = await study.record();
  const reversed = new Set(decisions.filter((decision) => decision.kind === "reverse").map(target));
  return decisions.filter((decision) => decision.kind === "note" && decision.exhibit === name && !reversed.has(decision.number));
}

export function openNote(name) {
  openDialog("What the team concluded", decisionForm({
    title: "In a sentence or two",
    fields: [{ name: "text", label: "It stands in the report beside this exhibit", long: true }],
    reason: false,
    action: "Record the note",
    decisions: (values) => [{ kind: "note", exhibit: name, text: values.text.trim() }],
    done: closeDialog,
    cancel: closeDialog,
  }));
}

export async function drawNotes(section, name) {
  const list = make("div", {});
  fill(section, make("h3", {}, "What the team concluded"), list,
    make("p", { class: "actions" }, button("Add a note", () => openNote(name), { "data-key": "note" })));
  try {
    const notes = await notesOf(name);
    fill(list, notes.length ? notes.map((note) => make("blockquote", {}, make("p", {}, note.text), make("footer", {}, `${note.by}, ${moment(note.at)}, decision ${note.number}`)))
      : make("p", { class: "quiet-text" }, "Nothing noted yet."));
  } catch (fault) {
    fill(list, make("p", { class: "trouble" }, fault.message));
  }
}

// In the meeting view the last note is pinned at the foot, with the next item in which something is open.
export async function drawFoot(place) {
  const foot = $("foot");
  foot.hidden = !place.meeting;
  if (!place.meeting) {
    fill(foot);
    return;
  }
  const item = study.exhibit(place.exhibit)?.item.number ?? 0;
  const open = (one) => one.exhibits?.length && /\d/.test(one.open ?? "") && /\bopen\b/.test(one.open ?? "") && !/^none\b/.test(one.open);
  const items = study.agenda.items;
  const next = items.find((one) => one.number > item && open(one)) ?? items.find((one) => one.number !== item && open(one)) ?? null;
  const notes = await notesOf(place.exhibit).catch(() => []);
  const last = notes.at(-1);
  fill(foot,
    make("p", { class: "note" }, last ? [make("strong", {}, last.text), ` ${last.by}, ${moment(last.at)}`] : "What the team concluded: nothing noted yet."),
    button("Note", () => openNote(place.exhibit), { "data-key": "foot-note" }),
    next ? make("a", { href: address.write({ ...place, exhibit: next.exhibits[0].name, args: {}, panel: "", cell: "", show: "", at: "" }), "data-key": "foot-next" },
      `Next open item: ${next.number} ${next.name}, ${next.open}`) : make("span", {}, open(items[item - 1] ?? {}) ? "No other item is open" : "No item is open"));
}
