// SPDX-License-Identifier: GPL-3.0-or-later
// The agenda at the left and the identifying line on top.
import * as address from "./address.js";
import { decisionForm, takeWho, whoFields } from "./decide.js";
import { $, button, closeDialog, fill, focusKey, make, openDialog, restoreFocus } from "./page.js";
import { deciding, study } from "./study.js";
import { count, day, fingerprint } from "./words.js";

export function drawTop() {
  const { agenda } = study;
  const who = deciding.words();
  const received = agenda.data?.received_at ? `data received ${day(agenda.data.received_at)}, ` : "";
  const keep = $("top").contains(document.activeElement) ? focusKey(document.activeElement) : null;
  fill($("top"),
    make("h1", {}, agenda.title),
    make("p", { class: "facts" },
      make("span", {}, `${received}${agenda.version ? `after decision ${agenda.version}` : "before any decision"}${agenda.locked ? ", locked" : ""}`),
      button(fingerprint(agenda.state_sha256), showData, { class: "quiet fingerprint", "data-key": "data", title: "Fingerprint of the current values; choose it for the file they come from" }),
      button(who ? `deciding: ${who}` : "nobody deciding yet", askWho, { class: "quiet", "data-key": "who", title: who ? "Change who is deciding" : "Say who is deciding" })),
    make("p", { class: "blinding", "data-blinding": agenda.blinding }, agenda.blinding.toUpperCase()));
  document.title = `${agenda.title} · Evenhand`;
  if (keep) restoreFocus(keep);
}

export function askWho() {
  const form = make("form", { class: "decision" }, whoFields(true),
    make("p", {}, "The record says this with every decision. It is kept until this browser window is closed."),
    make("p", { class: "buttons" }, make("button", { type: "submit", class: "strong" }, "Keep")));
  form.addEventListener("submit", (event) => {
    event.preventDefault();
    takeWho(form);
    closeDialog();
  });
  openDialog("Who is deciding", form);
}

function showData() {
  const { agenda } = study;
  const data = agenda.data ?? {};
  const row = (name, value) => (value === undefined || value === null ? null : [make("dt", {}, name), make("dd", {}, value)]);
  openDialog("Where the numbers come from", make("dl", { class: "origin" },
    row("Study file", agenda.study), row("Data file", data.name),
    row("Received", data.received_at?.replace("T", " ").replace(/(\.\d+)?Z$/, " UTC")),
    row("Size", data.length === undefined ? null : count(data.length, "byte")),
    row("Read as", [data.encoding, data.delimiter ? `delimiter: ${data.delimiter}` : null].filter(Boolean).join(", ")),
    row("Holds", data.records === undefined ? null : `${count(data.records, "record")}, ${count(data.columns, "column")}`),
    row("Fingerprint of the received bytes", agenda.data_sha256),
    row("Fingerprint of the current values", agenda.state_sha256),
    row("Head of the record", agenda.head),
    row("Decisions", String(agenda.version))));
}

export function showCare() {
  openDialog("What this is for, and what it is not for", make("p", { class: "care" }, study.agenda.care));
}

function askAttending() {
  openDialog("Who is attending", decisionForm({
    title: "Everyone at this meeting, one a line",
    fields: [{ name: "people", label: "Name or role", long: true, value: (study.agenda.attending ?? []).join("\n") }],
    reason: false,
    decisions: (values) => [{ kind: "attending", people: values.people.split(/\n|;/).map((name) => name.trim()).filter(Boolean) }],
    done: closeDialog,
    cancel: closeDialog,
  }));
}

export function drawAgenda(place, showKeys) {
  const { agenda } = study;
  const here = study.exhibit(place.exhibit)?.item.number ?? Number(place.exhibit.match(/^item-(\d)$/)?.[1] ?? 0);
  const keep = $("agenda").contains(document.activeElement) ? focusKey(document.activeElement) : null;
  const to = (item) => (item.exhibits[0] ? address.write({ ...place, exhibit: item.exhibits[0].name, args: {}, show: "", at: "" })
    : address.write({ ...place, exhibit: `item-${item.number}`, args: {}, show: "", at: "" }));
  fill($("agenda"),
    make("h2", {}, "Agenda"),
    make("ol", { class: "items" }, agenda.items.map((item) => make("li", { class: item.number === here ? "here" : null },
      make("a", { href: to(item), class: item.exhibits.length ? "item" : "item later", "data-key": `agenda-${item.number}`,
        title: item.open ? `${item.name}: ${item.open}` : item.name, "aria-current": item.number === here ? "true" : null },
      make("span", { class: "count" }, String(item.number)),
      make("span", { class: "name" }, item.name),
      item.open || item.later ? make("span", { class: "open" }, item.open || "in a later version") : null),
      item.number === here && item.exhibits.length > 1 ? make("ol", { class: "exhibits", "aria-label": `Exhibits of ${item.name}` },
        item.exhibits.map((exhibit) => make("li", {}, make("a", {
          href: address.write({ ...place, exhibit: exhibit.name, args: {}, show: "", at: "" }), "data-key": `exhibit-${exhibit.name}`,
          "aria-current": exhibit.name === place.exhibit ? "page" : null, title: exhibit.refused ?? exhibit.title, class: exhibit.refused ? "refused" : null,
        }, make("span", { class: "count" }, exhibit.number), make("span", { class: "name" }, exhibit.tab))))) : null))),
    make("div", { class: "attending" }, make("h2", {}, "Attending"),
      agenda.attending?.length ? make("ul", { class: "plain" }, agenda.attending.map((name) => make("li", {}, name))) : make("p", {}, "nobody entered yet"),
      button(agenda.attending?.length ? "Change" : "Enter who is here", askAttending, { class: "quiet", "data-key": "attending" })),
    make("ul", { class: "plain keys" },
      make("li", {}, make("a", { href: address.changed({ meeting: true }), "data-key": "to-meeting" }, "Meeting view"), make("kbd", {}, "m")),
      make("li", {}, button("All keys", showKeys, { class: "quiet", "data-key": "keys" }), make("kbd", {}, "?")),
      make("li", {}, button("What this is not for", showCare, { class: "quiet", "data-key": "care" }))));
  if (keep) restoreFocus(keep);
}
