// SPDX-License-Identifier: GPL-3.0-or-later
// The panel of one participant: values as received and as now current, discrepancies, decisions, where they count.
import * as address from "./address.js";
import { decisionForm, focusForm, valueDecision } from "./decide.js";
import { $, button, fill, focusKey, make, restoreFocus } from "./page.js";
import { reverse } from "./record.js";
import * as server from "./server.js";
import { study } from "./study.js";
import { count, decisionWords, moment, spaced } from "./words.js";

let shown = "";
let opener = null;
let data = null;
let busy = false; // a form is open: the panel is not redrawn under the person's hands

export function openParticipant(participant, cell, from) {
  opener = focusKey(from) ?? opener;
  address.go(address.changed({ panel: participant, cell: cell ?? "" }));
}

export function closeParticipant() {
  address.go(address.changed({ panel: "", cell: "" }));
  const target = opener;
  opener = null;
  restoreFocus(target, document.querySelector(".question"));
}

export async function showParticipant(place, again = false) {
  const panel = $("panel");
  document.body.classList.toggle("with-panel", place.panel !== "");
  panel.hidden = place.panel === "";
  if (!place.panel) {
    shown = "";
    busy = false;
    fill(panel);
    return;
  }
  const fresh = shown !== place.panel;
  if (!fresh && !again) {
    draw(place);
    return;
  }
  shown = place.panel;
  if (fresh) {
    busy = false;
    fill(panel, make("p", { class: "wait" }, `Fetching participant ${place.panel}…`));
  }
  try {
    const answer = await server.json(`/exhibit/participant.json?participant=${encodeURIComponent(place.panel)}`);
    if (shown !== place.panel) return;
    data = answer;
    if (!busy || fresh) draw(place);
    if (fresh) restoreFocus("#participant");
  } catch (fault) {
    fill(panel, head(place.panel, ""), make("p", { class: "trouble", role: "alert" }, fault.message));
  }
}

function head(participant, facts) {
  return make("header", {}, make("p", { class: "number" }, "Participant"),
    make("h2", { id: "participant", tabindex: "-1" }, participant), facts ? make("p", { class: "quiet-text" }, facts) : null,
    button("Close", closeParticipant, { class: "quiet close", "data-key": "panel-close", "aria-label": "Close the participant" }));
}

const levelWords = (value) => value.levels?.find((level) => level.code === value.current)?.label ?? value.current;

// Who this is, in a line: what does not belong to an outcome or an event.
function facts() {
  return data.values.filter((value) => !study.outcomeOf(value.label) && value.kind !== "event" && value.current)
    .slice(0, 4)
    .map((value) => (value.kind === "category" ? levelWords(value) : `${value.label} ${value.current}${value.unit ? ` ${value.unit}` : ""}`))
    .join(", ");
}

const currentWords = (value) => value.converted ?? (value.state === "observed" || !value.words ? spaced(value.current) ?? "missing" : value.words);

function offerForm(host, spec, cell) {
  busy = true;
  const close = () => {
    busy = false;
    fill(host);
    draw(address.read());
    restoreFocus(`[data-key="value-${CSS.escape(cell)}"]`, $("participant"));
  };
  const form = decisionForm({
    ...spec,
    cancel: close,
    done: () => {
      busy = false;
    },
    after_moved: () => restoreFocus(`[data-key="value-${CSS.escape(cell)}"]`, $("participant")),
  });
  fill(host, form);
  focusForm(form);
}

function actionsFor(value, discrepancy) {
  const host = make("div", { class: "form-host" });
  const more = discrepancy ? { discrepancy: discrepancy.id } : {};
  const offer = (kind) => () => offerForm(host, valueDecision(kind, data.participant, value, more), value.column);
  const proposal = discrepancy?.proposal;
  const has = value.current !== null && value.current !== "";
  if (value.derived) { // nothing to correct in what is computed: its inputs are values of their own
    return [make("p", { class: "quiet-text" }, `Computed: ${value.derived.formula} (${value.derived.inputs}). To change it, correct what it rests on.`),
      make("div", { class: "actions" },
        has ? button("Confirm as computed", offer("confirm"), { "data-key": `act-confirm-${value.column}` }) : null,
        button("Raise a query", offer("query"), { "data-key": `act-query-${value.column}` })), host];
  }
  return [make("div", { class: "actions" },
    proposal && discrepancy.state !== "settled" ? button(discrepancy.proposal_words ?? decisionWords(proposal), () => offerForm(host, {
      title: discrepancy.proposal_words ?? decisionWords(proposal),
      before: () => currentWords(value),
      after: () => proposal.to ?? (proposal.kind === "set-missing" || proposal.kind === "missing-code" ? "missing" : "read anew"),
      decisions: () => [{ ...proposal, discrepancy: discrepancy.id }],
    }, value.column), { class: "strong", "data-key": `act-accept-${value.column}` }) : null,
    button("Correct", offer("correct"), { "data-key": `act-correct-${value.column}` }),
    has ? button("Set missing", offer("set-missing"), { "data-key": `act-set-missing-${value.column}` }) : null,
    has ? button("Confirm as recorded", offer("confirm"), { "data-key": `act-confirm-${value.column}` }) : null,
    has ? button("Read as…", offer("read-as"), { "data-key": `act-read-as-${value.column}` }) : null,
    discrepancy?.state === "queried" ? button("Enter the answer", async () => {
      const form = await answerForm(discrepancy);
      if (form) offerForm(host, form, value.column);
    }, { "data-key": `act-answer-${value.column}` }) : null,
    button("Raise a query", offer("query"), { "data-key": `act-query-${value.column}` })), host];
}

function keepActions(discrepancy) {
  const host = make("div", { class: "form-host" });
  return [make("div", { class: "actions" }, (discrepancy.rows ?? []).map((row) =>
    button(`Keep record ${row}`, () => offerForm(host, keepRecord(data.participant, row, discrepancy), ""), { "data-key": `panel-keep-${row}` })),
  button("Raise a query", () => offerForm(host, {
    title: `Ask the site about ${data.participant}`,
    fields: [{ name: "question", label: "Question to the site", long: true }],
    says: () => "The records stay aside until one is kept.",
    decisions: (values) => [{ kind: "query", participant: data.participant, question: values.question.trim(), discrepancy: discrepancy.id }],
  }, ""), { "data-key": "act-query-records" })), host];
}

export function keepRecord(participant, row, discrepancy) {
  const others = (discrepancy.rows ?? []).filter((other) => other !== row);
  return {
    title: `Let record ${row} stand for ${participant}`,
    before: () => `${count(others.length + 1, "record")} held aside: ${[...others, row].sort((a, b) => a - b).join(", ")}`,
    after: () => `record ${row} in force; ${others.join(", ")} stays aside`,
    decisions: () => [{ kind: "keep-record", participant, ...(discrepancy.file ? { file: discrepancy.file } : {}), row, discrepancy: discrepancy.id }],
  };
}

// The site's answer to the last query about a discrepancy, as a form; null where none was asked.
export async function answerForm(discrepancy) {
  const query = (await study.record()).filter((decision) => decision.kind === "query" && decision.discrepancy === discrepancy.id && decision.stands !== false).at(-1);
  return query ? {
    title: `The site’s answer to query ${query.number}`,
    fields: [{ name: "text", label: "Answer, as the site gave it", long: true }],
    says: () => `Asked: ${query.text ?? query.words} The answer changes no value; correct or confirm it afterwards.`,
    reason: false,
    action: "Record the answer",
    decisions: (values) => [{ kind: "response", number: query.number, text: values.text.trim() }],
  } : null;
}

function discrepancyPart(discrepancy) {
  const value = data.values.find((one) => one.column === discrepancy.column);
  const settled = discrepancy.state === "settled" ? ` Settled by decision ${discrepancy.settled_by || "taken elsewhere"}.`
    : discrepancy.state === "queried" ? " A query is open." : "";
  return make("li", { "data-state": discrepancy.state },
    make("p", {}, make("strong", {}, discrepancy.title), " ", make("span", {}, discrepancy.message), settled ? make("span", { class: "quiet-text" }, settled) : null),
    discrepancy.state === "settled" ? null : discrepancy.rows ? keepActions(discrepancy) : value ? actionsFor(value, discrepancy) : null);
}

function valueRow(value, chosen) {
  const changed = value.current !== value.received && !value.derived;
  const open = chosen === value.column;
  const above = data.discrepancies.some((discrepancy) => discrepancy.column === value.column && discrepancy.state !== "settled");
  return [make("tr", { class: open ? "chosen" : null },
    make("th", { scope: "row" }, make("button", {
      type: "button", class: "name", "data-key": `value-${value.column}`, "aria-expanded": String(open),
      on: { click: () => address.go(address.changed({ cell: open ? "" : value.column })) },
    }, value.label, value.unit ? make("small", {}, ` ${value.unit}`) : null), value.doubtful ? make("small", { class: "doubtful" }, " doubtful") : null),
    make("td", { class: changed ? "replaced" : null }, value.derived ? make("small", {}, "computed") : value.received === "" ? make("em", {}, "blank") : spaced(value.received) ?? "–"),
    make("td", {}, value.state === "observed" ? currentWords(value) : make("em", {}, currentWords(value)),
      value.origin ? make("small", {}, ` by decision ${value.origin}`) : null)),
  open ? make("tr", { class: "chosen" }, make("td", { colspan: "3" }, above ? make("small", {}, "What can be done stands with its discrepancy above.") : actionsFor(value, null))) : null];
}

// While several records are held aside: what each of them says, so that one can be chosen.
function recordsTable(records) {
  return make("table", { class: "values by-record" },
    make("thead", {}, make("tr", {}, make("th", { scope: "col" }, "Variable"), records.map((record) => make("th", { scope: "col" }, `Record ${record}`)))),
    make("tbody", {}, data.values.map((value) => make("tr", { class: new Set(value.on_records).size > 1 ? "differs" : null },
      make("th", { scope: "row" }, value.label, value.unit ? make("small", {}, ` ${value.unit}`) : null),
      value.on_records.map((text) => make("td", {}, text === "" ? make("em", {}, "blank") : text))))));
}

function valuesTable(place) {
  const ordered = [...data.values].sort((a, b) => Number(b.doubtful ?? false) - Number(a.doubtful ?? false));
  return [make("table", { class: "values" },
    make("thead", {}, make("tr", {}, make("th", { scope: "col" }, "Variable"), make("th", { scope: "col" }, "Received"), make("th", { scope: "col" }, "Current"))),
    make("tbody", {}, ordered.map((value) => valueRow(value, place.cell)))),
  make("p", { class: "quiet-text" }, "Choose a variable to correct it, set it missing, confirm it, read it as another value or ask the site.")];
}

function draw(place) {
  if (busy || !data || data.participant !== place.panel) return;
  const panel = $("panel");
  const keep = panel.contains(document.activeElement) ? focusKey(document.activeElement) : null;
  const scroll = panel.scrollTop;
  const open = data.discrepancies.filter((discrepancy) => discrepancy.state !== "settled");
  const settled = data.discrepancies.filter((discrepancy) => discrepancy.state === "settled");
  const records = data.records ?? [], files = (data.files ?? []).filter((file) => file.records.length);
  fill(panel,
    head(data.participant, facts()),
    make("p", { class: "quiet-text" }, files.length ? files.map((file) => `${file.file}${file.visit === null ? "" : ` ${file.visit}`}: ${file.records.join(", ")}`).join("; ") : records.length > 1 ? `Records ${records.join(" and ")} of the file` : records.length ? `Record ${records[0]} of the file` : ""),
    open.length ? [make("h3", {}, open.length === 1 ? "Open discrepancy" : `${open.length} open discrepancies`),
      make("ul", { class: "plain discrepancies" }, open.map(discrepancyPart))] : null,
    make("h3", {}, "Values"),
    data.held_aside && data.values.every((value) => value.on_records?.length === records.length) ? recordsTable(records) : valuesTable(place),
    settled.length ? [make("h3", {}, "Settled discrepancies"), make("ul", { class: "plain discrepancies" }, settled.map(discrepancyPart))] : null,
    make("h3", {}, "Decisions"),
    data.decisions.length ? make("ol", { class: "plain decisions" }, data.decisions.map((decision) => make("li", {},
      make("span", { class: "count" }, String(decision.number)),
      make("div", {}, make("p", {}, decision.words ?? decisionWords(decision)),
        make("p", { class: "quiet-text" }, [decision.by, moment(decision.at), decision.reason, decision.evidence].filter(Boolean).join(" · ")),
        decision.stands === false ? make("p", { class: "quiet-text" }, "Reversed.")
          : decision.reversible ? button("Reverse", () => reverse(decision), { class: "quiet", "data-key": `panel-reverse-${decision.number}`, "aria-label": `Reverse decision ${decision.number}` }) : null))))
      : make("p", { class: "quiet-text" }, "None concerns this participant."),
    make("h3", {}, "Counts in"),
    make("ul", { class: "plain counts" }, (data.analyses ?? []).map((analysis) => make("li", {},
      make("strong", {}, analysis.counts ? "Yes" : "No"), make("span", {}, `${analysis.label}, ${analysis.visit}`,
        analysis.why ? make("small", { class: "quiet-text" }, ` ${analysis.why}`) : null)))));
  panel.scrollTop = scroll;
  if (keep) restoreFocus(keep, $("participant"));
}
