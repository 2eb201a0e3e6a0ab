// SPDX-License-Identifier: GPL-3.0-or-later
// Doubtful values: what the checks noticed, grouped and counted, and settled one by one or several alike with one reason.
import * as address from "./address.js";
import { decisionForm, focusForm, valueDecision } from "./decide.js";
import { button, fill, make, restoreFocus, say } from "./page.js";
import { answerForm, keepRecord, openParticipant } from "./participant.js";
import * as server from "./server.js";
import { study } from "./study.js";
import { columns, count, decisionWords, spaced } from "./words.js";

const state = { article: null, list: [], counts: null, later: new Set(), at: "", show: "open", form: null };

const severities = { "must-settle": "must be settled", "worth-a-look": "worth a look" };
const states = { open: "open", settled: "settled", queried: "asked the site" };
const people = (discrepancy) => discrepancy.participants?.length ? discrepancy.participants : discrepancy.participant ? [discrepancy.participant] : [];

export async function makeDoubtful(entry, place, signal) {
  // Without the names the list works too, with the columns' own.
  const [answer] = await Promise.all([server.json("/exhibit/discrepancies.json", signal), study.names().catch(() => {})]);
  const article = make("article", { class: "exhibit doubtful-list", "data-exhibit": entry.name, "data-version": String(answer.version ?? "") });
  const kept = state.form?.isConnected && state.list.some((discrepancy) => discrepancy.id === state.at) ? state.form : null;
  Object.assign(state, { article, list: answer.discrepancies, counts: answer.counts, show: place.show || "open", form: null });
  if (place.at) state.at = place.at;
  draw(entry);
  // Somebody else recorded something while a form was open here: what was typed stays.
  const host = article.querySelector(".settle .form-host");
  if (kept && host) {
    host.append(kept);
    state.form = kept;
  }
  return article;
}

// Groups in the order the server gives: that of its table of checks.
function groups() {
  const found = new Map();
  for (const discrepancy of state.list) {
    if (!found.has(discrepancy.check)) found.set(discrepancy.check, { title: discrepancy.title, severity: discrepancy.severity, all: [], shown: [] });
    const group = found.get(discrepancy.check);
    group.all.push(discrepancy);
    if (state.show === "all" || discrepancy.state === "open") group.shown.push(discrepancy);
  }
  return [...found.values()].filter((group) => group.shown.length);
}

const visible = () => groups().flatMap((group) => group.shown);
const current = () => state.list.find((discrepancy) => discrepancy.id === state.at) ?? null;

// Others still open that the same kind of decision would settle in the same way.
function alike(discrepancy) {
  return state.list.filter((other) => other !== discrepancy && other.state === "open" && other.check === discrepancy.check &&
    other.column === discrepancy.column && (discrepancy.proposal?.kind ?? "") === (other.proposal?.kind ?? "") && !other.rows);
}

function draw(entry) {
  const list = visible();
  if (list.length && !list.some((discrepancy) => discrepancy.id === state.at)) {
    state.at = (list.find((discrepancy) => !state.later.has(discrepancy.id)) ?? list[0]).id;
  }
  const { counts } = state;
  const total = state.list.length;
  const tab = (value, label) => make("a", { href: address.changed({ show: value, at: "" }), "data-value": value,
    "aria-current": state.show === value ? "true" : null }, label);
  fill(state.article,
    make("p", { class: "number" }, entry.number),
    make("h2", { class: "question" }, entry.title),
    make("nav", { class: "tabs", "data-argument": "show", "aria-label": "Which discrepancies" },
      tab("open", `Open, ${counts.open}`), tab("all", `All, ${total}`)),
    make("p", { class: "lead" }, counts.open
      ? [make("strong", { class: "large" }, String(counts.open)), ` open of ${count(total, "discrepancy", "discrepancies")}; ${counts.settled} settled, ${counts.queried} asked of the sites. Nothing changes until somebody decides.`]
      : [`Nothing is open. ${counts.settled} of ${count(total, "discrepancy", "discrepancies")} settled, ${counts.queried} asked of the sites.`]),
    groups().map(groupPart),
    list.length ? make("p", { class: "hints", "aria-label": "Keys" }, [["n", "next"], ["p", "previous"], ["a", "accept the proposal"], ["c", "confirm"], ["q", "query"], ["s", "set missing"],
      ["e", "correct"], ["l", "later"], ["Enter", "participant"]].map(([key, words]) => make("span", {}, make("kbd", {}, key), ` ${words}`))) : null,
    total === 0 ? make("p", {}, "The checks found nothing doubtful in this file.") : null,
    total > 0 && !list.length ? make("p", {}, "Choose All above to see what was settled and how.") : null);
}

function groupPart(group) {
  const open = group.all.filter((discrepancy) => discrepancy.state === "open").length;
  return make("section", { class: "check" },
    make("h3", {}, group.title, make("small", {}, ` ${open} open of ${group.all.length}, ${severities[group.severity] ?? group.severity}`)),
    make("ul", { class: "plain" }, group.shown.map(itemPart)));
}

function who(discrepancy) {
  const list = people(discrepancy);
  return list.length > 2 ? `${list.length} participants` : list.join(", ") || "whole column";
}

function itemPart(discrepancy) {
  const at = discrepancy.id === state.at;
  const only = people(discrepancy).length === 1 ? people(discrepancy)[0] : null;
  return make("li", { class: at ? "at" : null, "data-id": discrepancy.id },
    make("button", { type: "button", class: "item", "data-key": `item-${discrepancy.id}`, "aria-expanded": String(at), "data-participant": only,
      on: { click: (event) => { event.stopPropagation(); at ? keys.Enter() : choose(discrepancy.id); } } },
    make("span", { class: "who" }, who(discrepancy)),
    make("span", { class: "what" }, discrepancy.message),
    make("span", { class: "state" }, discrepancy.state === "open" ? (state.later.has(discrepancy.id) ? "later" : "") : states[discrepancy.state],
      discrepancy.settled_by ? ` by ${discrepancy.settled_by}` : "")),
    at ? make("div", { class: "settle" }, settlePart(discrepancy)) : null);
}

const value = (discrepancy) => ({ column: discrepancy.column, label: columns.get(discrepancy.column)?.label || discrepancy.column, unit: columns.get(discrepancy.column)?.unit ?? "", current: discrepancy.value, levels: [] });

function settlePart(discrepancy) {
  const open = discrepancy.state !== "settled";
  const list = people(discrepancy);
  const valued = open && discrepancy.column && discrepancy.value !== null && list.length > 0 && !discrepancy.rows;
  const act = (key, label, attributes) => make("button", { type: "button", "data-key": `do-${key}`, ...attributes, on: { click: () => keys[key]() } },
    label, make("kbd", { "aria-hidden": "true" }, key));
  return [
    list.length > 2 ? make("p", { class: "people" }, list.map((id, at) => [at ? ", " : "", make("a", { href: address.changed({ panel: id, cell: discrepancy.column ?? "" }) }, id)])) : null,
    make("div", { class: "actions" },
      open && discrepancy.proposal ? act("a", discrepancy.proposal_words ?? decisionWords(discrepancy.proposal), { class: "strong" }) : null,
      open && discrepancy.rows ? discrepancy.rows.map((row) => button(`Keep record ${row}`, () => offer(keepRecord(list[0], row, discrepancy)), { "data-key": `keep-${row}` })) : null,
      valued ? (discrepancy.proposal?.kind !== "confirm" ? act("c", "Confirm") : null) : open && notable.has(discrepancy.check) ? act("c", "Note that it is right as it is") : null,
      valued ? act("s", "Set missing") : null,
      valued ? act("e", "Correct") : null,
      discrepancy.state === "queried" ? act("r", "Enter the answer") : null,
      open ? act("q", "Raise a query") : null,
      list.length ? act("Enter", "Participant") : null,
      open ? act("l", "Later") : null),
    make("div", { class: "form-host" })];
}

function choose(id, focus = true) {
  state.at = id;
  state.form = null;
  address.slip(address.changed({ at: id }));
  draw(entryOf());
  if (focus) restoreFocus(`[data-key="item-${CSS.escape(id)}"]`);
}

const entryOf = () => ({ name: state.article.dataset.exhibit, number: state.article.querySelector(".number").textContent, title: state.article.querySelector(".question").textContent });

function step(by) {
  const list = visible();
  const from = list.findIndex((discrepancy) => discrepancy.id === state.at);
  if (!list.length) return;
  for (let tried = 1; tried <= list.length; tried++) {
    const next = list[(from + by * tried + list.length * tried) % list.length];
    if (by < 0 || !state.later.has(next.id) || tried === list.length) {
      choose(next.id);
      return;
    }
  }
}

function offer(spec) {
  const host = state.article.querySelector(".settle .form-host");
  if (!host) return;
  const id = state.at;
  const list = visible();
  const at = list.findIndex((discrepancy) => discrepancy.id === id);
  const next = list[at + 1] ?? list[at - 1];
  state.form = decisionForm({
    ...spec,
    cancel: () => choose(id),
    // The next open one is taken up as soon as this one is on disk.
    done: () => {
      state.form = null;
      if (state.show === "open" && next) state.at = next.id;
      address.slip(address.changed({ at: state.at }));
    },
    after_moved: () => restoreFocus(`[data-key="item-${CSS.escape(state.at)}"]`, state.article.querySelector(".question")),
  });
  fill(host, state.form);
  focusForm(state.form);
}

// One decision for each participant of a discrepancy, and for those alike where the box is ticked.
function forEach(discrepancy, kind, make_one) {
  const others = alike(discrepancy);
  const several = others.length ? { count: others.length,
    words: `The same for ${others.length === 1 ? "the other one" : `the ${others.length} others`} alike: ${others.slice(0, 6).map((other) => `${who(other)} ${other.value ?? ""}`.trim()).join(", ")}${others.length > 6 ? " …" : ""}` } : null;
  return { alike: several, decisions: (values) => [discrepancy, ...(values.alike ? others : [])].flatMap((one) =>
    kind === "proposal" ? [{ ...one.proposal, discrepancy: one.id }] : people(one).map((participant) => make_one(one, participant, values))) };
}

// About no cell: what was found is written in a note that names the discrepancy, and that settles it.
const notable = new Set(["site-unit", "screening-sum"]);

function offerNote(discrepancy) {
  offer({
    title: "Note that it is right as it is",
    fields: [{ name: "text", label: "What was found", long: true }],
    decisions: (values) => [{ kind: "note", exhibit: "discrepancies", text: values.text.trim(), discrepancy: discrepancy.id }],
  });
}

function offerValue(kind) {
  const discrepancy = current();
  if (discrepancy && kind === "confirm" && discrepancy.state !== "settled" && notable.has(discrepancy.check)) {
    offerNote(discrepancy);
    return;
  }
  if (!discrepancy || discrepancy.state === "settled" || (discrepancy.value === null && kind !== "query")) return;
  const list = people(discrepancy);
  if (discrepancy.rows && kind !== "query") {
    say("Two records bear this identifier: choose which of them stands, or ask the site.");
    return;
  }
  const spec = valueDecision(kind, list[0], value(discrepancy), { discrepancy: discrepancy.id });
  if (list.length !== 1) spec.title = spec.title.replace(` of ${list[0]}`, ` of ${who(discrepancy)}`);
  const decisions = {
    confirm: (one, participant) => ({ kind: "confirm", column: one.column, participant, value: one.value, discrepancy: one.id }),
    "set-missing": (one, participant) => ({ kind: "set-missing", column: one.column, participant, from: one.value, discrepancy: one.id }),
    query: (one, participant, values) => ({ kind: "query", ...(one.column ? { column: one.column } : {}), participant, question: values.question.trim(), discrepancy: one.id }),
  };
  if (kind === "correct") offer(list.length === 1 ? spec : { ...spec, decisions: (values) => list.map((participant) =>
    ({ kind: "correct", column: discrepancy.column, participant, from: discrepancy.value, to: values.to.trim(), discrepancy: discrepancy.id })) });
  else offer({ ...spec, ...forEach(discrepancy, kind, decisions[kind]) });
}

function accept() {
  const discrepancy = current();
  if (!discrepancy || discrepancy.state === "settled") return;
  if (!discrepancy.proposal) {
    say("The program proposes nothing here: confirm the value, correct it, set it missing or ask the site.");
    return;
  }
  const { proposal } = discrepancy;
  const whole = proposal.participant === undefined;
  offer({
    title: discrepancy.proposal_words ?? decisionWords(proposal),
    before: () => (discrepancy.value === null ? null : discrepancy.value === "" ? "blank" : spaced(discrepancy.value)),
    after: () => (notable.has(discrepancy.check) ? discrepancy.proposal_words : null) ?? spaced(proposal.to) ?? (proposal.kind === "number-format" ? (discrepancy.value ?? "").replace(",", ".") || null : proposal.kind === "confirm" ? proposal.value
      : proposal.kind === "date-order" ? `read as ${proposal.order}` : proposal.kind === "keep-record" ? `record ${proposal.row} in force` : "missing"),
    says: notable.has(discrepancy.check) ? () => discrepancy.message : whole ? () => `Holds for ${proposal.site ? `all dates of site ${proposal.site} in this column` : "the whole column"}, so it settles every one like it.` : null,
    ...(whole ? { decisions: () => [{ ...proposal, discrepancy: discrepancy.id }] } : forEach(discrepancy, "proposal")),
  });
}

export const keys = {
  n: () => step(1),
  p: () => step(-1),
  a: accept,
  c: () => offerValue("confirm"),
  q: () => offerValue("query"),
  s: () => offerValue("set-missing"),
  e: () => offerValue("correct"),
  r: async () => {
    const discrepancy = current();
    const form = discrepancy?.state === "queried" ? await answerForm(discrepancy) : null;
    if (form) offer(form);
  },
  l: () => {
    state.later.add(state.at);
    step(1);
  },
  Enter: () => {
    const discrepancy = current();
    const [first] = discrepancy ? people(discrepancy) : [];
    if (first) openParticipant(first, discrepancy.column ?? "", state.article.querySelector(".at .item"));
  },
};
export const doubtfulShown = () => state.article?.isConnected ?? false;
