// SPDX-License-Identifier: GPL-3.0-or-later
// The open study as the page knows it: its agenda at one version, and who is deciding.
import * as server from "./server.js";
import { columns } from "./words.js";

let names_of = ""; // the data whose columns are named in words.js

export const study = Object.assign(new EventTarget(), {
  agenda: null,
  list: null, // the record at this version, fetched when first asked for

  async load() {
    const agenda = await server.json("/agenda.json");
    study.list = null;
    study.agenda = agenda;
    return agenda;
  },

  // After something was recorded, here or by somebody else: everything on the screen follows.
  async moved() {
    await study.load();
    await study.redraw();
  },
  redraw: async () => {}, // set by the page

  // What the plan calls the columns; the same at every version of a study.
  async names() {
    if (names_of === study.agenda.data_sha256) return;
    const answer = await server.json("/exhibit/columns.json");
    columns.clear();
    for (const { column, label, unit } of answer.columns) columns.set(column, { label, unit });
    names_of = study.agenda.data_sha256;
  },

  async record() {
    const version = study.agenda.version;
    study.list ??= server.json("/exhibit/decisions.json");
    try {
      const list = await study.list;
      return list.decisions.filter((decision) => decision.number <= Math.max(version, list.version ?? version));
    } catch (error) {
      study.list = null;
      throw error;
    }
  },

  // Exhibits in the order of the agenda, each with its item.
  exhibits() {
    return study.agenda.items.flatMap((item) => item.exhibits.map((exhibit) => ({ ...exhibit, item })));
  },

  exhibit(name) {
    return study.exhibits().find((exhibit) => exhibit.name === name) ?? null;
  },

  outcome(id) {
    return study.agenda.outcomes.find((outcome) => outcome.id === id) ?? null;
  },

  // A variable of an outcome is called by the outcome and the visit: "Systolic blood pressure, 26 weeks".
  outcomeOf(label) {
    return study.agenda.outcomes.find((outcome) => label === outcome.label || label?.startsWith(`${outcome.label}, `)) ?? null;
  },
});

// Who is deciding is asked once in a session of the browser and can be changed.
const key = "evenhand-deciding";
export const deciding = {
  get() {
    try {
      return JSON.parse(sessionStorage.getItem(key)) ?? { name: "", role: "" };
    } catch {
      return { name: "", role: "" };
    }
  },
  set(name, role) {
    sessionStorage.setItem(key, JSON.stringify({ name, role }));
    study.dispatchEvent(new Event("deciding"));
  },
  words() {
    const { name, role } = deciding.get();
    return role ? `${name}, ${role}` : name;
  },
};
