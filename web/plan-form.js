// SPDX-License-Identifier: GPL-3.0-or-later
// The form on which a person says what the columns of an export mean. It starts from guesses, shows the plan as it grows,
// saves it as a file, and makes the study. Every field knows its path in the plan, so that a fault stands where it belongs.
import { takeWho, whoFields } from "./decide.js";
import { $, button, fill, make, restoreFocus } from "./page.js";
import * as server from "./server.js";
import { accepted, sendFiles, takesDrops } from "./start.js";
import { deciding } from "./study.js";
import { count } from "./words.js";

const form = { plan: null, guess: null, draft: "", file: "", fault: null, element: null, pre: null, said: new Map(), opened: null, back: null };

export function showPlanForm(answer, opened, back, refused = []) {
  const { guess } = answer;
  const stem = (guess.name ?? "trial").replace(/\.[^.]*$/, "").replace(/[^\p{L}\p{N}._-]+/gu, "-") || "trial";
  Object.assign(form, { plan: complete(answer.plan), guess, draft: answer.draft, file: `${stem}.study`, fault: refused.join(" ") || null, said: new Map(), opened, back });
  draw();
  window.scrollTo(0, 0);
  restoreFocus(".question", $("main"));
}

// Parts that the form relies on, whatever the plan leaves out.
function complete(plan) {
  const whole = { title: "", participant: "", outcomes: [], covariates: [], events: [], missing_codes: [], adjust_for: [], subgroups: [], blinding: "pooled", ...plan };
  if (whole.arm && !whole.arm.levels) whole.arm.levels = [];
  const places = [whole.arm, whole.site, ...whole.covariates, ...whole.events, ...whole.outcomes.flatMap((outcome) => outcome.visits ?? [])];
  for (const place of places) {
    if (!place?.file) continue;
    place.column = `${place.file}.${place.column}${place.visit === undefined ? "" : `@${place.visit}`}`;
    delete place.file;
    delete place.visit;
  }
  return whole;
}

// What goes to the server: the same without what is empty.
function clean(value) {
  if (Array.isArray(value)) return value.map(clean);
  if (value === null || typeof value !== "object") return value;
  const result = {};
  for (const [key, part] of Object.entries(value)) {
    if (part === undefined || part === null || (Array.isArray(part) && part.some((one) => one === null))) continue;
    if (["bands", "levels"].includes(key) && Array.isArray(part) && part.length === 0) continue;
    result[key] = clean(part);
  }
  return result;
}

// A column by the name that the plan gives it: COLUMN, FILE.COLUMN, or FILE.COLUMN@CODE at one visit of a file with a row for each.
const column = (name) => form.guess.columns.find((one) => one.name === name) ??
  form.guess.columns.find((one) => one.layout === "visit" && name?.startsWith(`${one.name}@`));
const codesOf = (one) => (one.layout === "visit" ? form.guess.files.find((file) => file.id === one.file).codes : []);
const placesOf = (one) => (one.layout === "visit" ? codesOf(one).map(({ code }) => `${one.name}@${code}`) : [one.name]);
const series = (name) => form.guess.series?.find((one) => one.visits.some((visit) => visit.column === name));
const idOf = (text) => text.toLowerCase().normalize("NFKD").replace(/[^a-z0-9]+/g, "_").replace(/^_|_$/g, "") || "x";

function uses() {
  const { plan } = form;
  const used = new Map();
  const add = (said, words) => {
    const name = column(said)?.name ?? said;
    if (name) used.set(name, [...(used.get(name) ?? []), words]);
  };
  if (plan.files) {
    for (const file of plan.files) {
      add(`${file.id}.${file.participant}`, "identifier");
      if (file.visit) add(`${file.id}.${file.visit}`, "code of the visit");
    }
  } else {
    add(plan.participant, "identifier");
  }
  add(plan.arm?.column, "arm");
  for (const outcome of plan.outcomes) for (const visit of outcome.visits ?? []) add(visit.column, `${outcome.label || outcome.id}, ${visit.label}`);
  for (const covariate of plan.covariates) add(covariate.column, covariate.label || covariate.id);
  for (const event of plan.events) add(event.column, event.label || event.id);
  add(plan.site?.column, "site");
  return used;
}

// --- fields bound to the plan ------------------------------------------------------------------------------------------

function changed(redraw) {
  form.pre.textContent = JSON.stringify(clean(form.plan), null, 2);
  if (redraw) draw();
}

const label = (words, input, wide) => make("label", { class: wide ? "wide" : null }, make("span", {}, words), input);

function textField(words, object, key, path, more = {}) {
  const input = make("input", { value: object[key] ?? "", autocomplete: "off", "data-path": path, "data-key": path, required: more.required, placeholder: more.placeholder,
    on: { input: () => {
      object[key] = input.value;
      changed(false);
    } } });
  return label(words, input, more.wide);
}

function number(text) {
  const written = text.trim().replace("−", "-");
  return written !== "" && Number.isFinite(Number(written)) ? Number(written) : null;
}

function numberField(words, object, key, path) {
  const input = make("input", { value: object[key] ?? "", inputmode: "decimal", autocomplete: "off", "data-path": path, "data-key": path, on: { input: () => {
    const value = number(input.value);
    input.setAttribute("aria-invalid", String(input.value.trim() !== "" && value === null));
    object[key] = value ?? undefined;
    changed(false);
  } } });
  return label(words, input);
}

function rangeFields(words, object, key, path) {
  const given = object[key] ?? [null, null];
  const bound = (at, end) => {
    const input = make("input", { value: given[at] ?? "", inputmode: "decimal", autocomplete: "off", "data-path": path, "data-key": `${path}.${at}`, on: { input: () => {
      const value = number(input.value);
      input.setAttribute("aria-invalid", String(input.value.trim() !== "" && value === null));
      const range = [...(object[key] ?? [null, null])];
      range[at] = value;
      object[key] = range[0] === null && range[1] === null ? undefined : range;
      changed(false);
    } } });
    return label(`${words} ${end}`, input);
  };
  return [bound(0, "from"), bound(1, "to")];
}

function listField(words, object, key, path, read = (text) => text, wide = false) {
  const input = make("input", { value: (object[key] ?? []).join(", "), autocomplete: "off", "data-path": path, "data-key": path, on: { input: () => {
    object[key] = input.value.split(",").map((part) => read(part.trim())).filter((part) => part !== "" && part !== null);
    changed(false);
  } } });
  return label(words, input, wide);
}

function choice(words, options, value, path, choose, wide) {
  const select = make("select", { "data-path": path, "data-key": path, on: { change: () => choose(select.value) } },
    options.map(([code, text]) => make("option", { value: code, selected: code === value }, text)));
  if (!options.some(([code]) => code === value)) select.selectedIndex = -1;
  return label(words, select, wide);
}

function columnField(words, object, key, path, more = {}) {
  const options = form.guess.columns.flatMap(placesOf).map((name) => [name, name]);
  if (more.none) options.unshift(["", more.none]);
  return choice(words, options, object[key] ?? "", path, (value) => {
    object[key] = value;
    more.then?.(value);
    changed(true);
  });
}

const remove = (list, at, words, path) => button("Remove", () => {
  list.splice(at, 1);
  changed(true);
}, { class: "quiet", "aria-label": `Remove ${words}`, "data-key": `${path}.remove` });

function ticks(words, key, path, hint) {
  const { plan } = form;
  return make("div", {}, make("p", { class: "hint" }, make("strong", {}, words), ` ${hint}`),
    plan.covariates.length ? make("div", { class: "ticks" }, plan.covariates.map((covariate) => make("label", { class: "tick" },
      make("input", { type: "checkbox", checked: plan[key].includes(covariate.id), "data-path": path, "data-key": `${path}.${covariate.id}`, on: { change: (event) => {
        plan[key] = plan.covariates.map((one) => one.id).filter((id) => (id === covariate.id ? event.target.checked : plan[key].includes(id)));
        changed(false);
      } } }), make("span", {}, covariate.label || covariate.id)))) : make("p", { class: "hint" }, "There are no covariates yet."));
}

// --- the parts of the form -----------------------------------------------------------------------------------------------

function trialPart() {
  const { plan } = form;
  const file = make("input", { value: form.file, required: true, autocomplete: "off", "data-path": "file", "data-key": "file", on: { input: () => (form.file = file.value) } });
  return make("fieldset", {}, make("legend", {}, "The trial"),
    make("div", { class: "fields" }, textField("Title", plan, "title", "title", { wide: true, required: true, placeholder: "as in the protocol" }), label("Study file to make", file),
      plan.files ? null : columnField("Participant’s identifier", plan, "participant", "participant")),
    who());
}

function who() {
  const known = deciding.words();
  if (!known) return whoFields();
  return make("p", { class: "hint" }, `Deciding: ${known}. `, button("Change", () => {
    deciding.set("", "");
    draw();
  }, { class: "quiet", "data-key": "change-who" }));
}

function armLevels(name) {
  const values = column(name)?.values.filter((value) => value.listed) ?? [];
  return values.map((value, at) => ({ code: value.text, label: value.label ?? value.text, ...(at === 0 ? { reference: true } : {}) }));
}

function levelRows(levels, path, extra) {
  return make("table", { class: "rows" },
    make("thead", {}, make("tr", {}, make("th", { scope: "col" }, "Code in the file"), make("th", { scope: "col" }, "Name in words"), extra ? make("th", { scope: "col" }, extra.words) : null, make("th", {}))),
    make("tbody", {}, levels.map((level, at) => make("tr", {},
      make("td", {}, cellField(level, "code", `${path}[${at}].code`, "Code in the file")), make("td", {}, cellField(level, "label", `${path}[${at}].label`, "Name in words")),
      extra ? make("td", {}, extra.of(level, at)) : null, make("td", {}, remove(levels, at, level.code, `${path}[${at}]`))))));
}

function cellField(object, key, path, words) {
  const input = make("input", { value: object[key] ?? "", "aria-label": words, autocomplete: "off", "data-path": path, "data-key": path, on: { input: () => {
    object[key] = input.value;
    changed(false);
  } } });
  return input;
}

const add = (words, key, act) => button(words, () => {
  act();
  changed(true);
}, { class: "quiet", "data-key": key });

function armPart() {
  const { plan } = form;
  const holder = { column: plan.arm?.column ?? "" };
  const reference = { words: "Reference", of: (level, at) => make("input", { type: "radio", name: "reference", checked: Boolean(level.reference), "aria-label": `${level.code} is the reference`,
    "data-key": `arm.reference.${at}`, on: { change: () => {
      for (const one of plan.arm.levels) delete one.reference;
      level.reference = true;
      changed(false);
    } } }) };
  return make("fieldset", {}, make("legend", {}, "Arms"),
    make("div", { class: "fields" }, columnField("Column of the arm", holder, "column", "arm.column", { none: "none: arms come later", then: (name) => {
      plan.arm = name ? { column: name, levels: armLevels(name) } : undefined;
    } }),
    choice("Blinding to begin with", [["pooled", "pooled: no arms"], ["coded", "coded: arms as letters"], ["unblinded", "unblinded: arms by name"]], plan.blinding, "blinding", (value) => {
      plan.blinding = value;
      changed(false);
    }, true)),
    make("p", { class: "hint", "data-at": "arm" }),
    plan.arm ? [levelRows(plan.arm.levels, "arm.levels", reference), add("Add an arm", "arm.add", () => plan.arm.levels.push({ code: "", label: "" }))] : null);
}

function visitRows(outcome, path) {
  return make("table", { class: "rows" },
    make("thead", {}, make("tr", {}, make("th", { scope: "col" }, "Visit, the baseline first"), make("th", { scope: "col" }, "Column"), make("th", {}))),
    make("tbody", {}, outcome.visits.map((visit, at) => make("tr", {}, make("td", {}, cellField(visit, "label", `${path}.visits[${at}].label`, "Visit")),
      make("td", {}, columnSelect(visit, `${path}.visits[${at}].column`)), make("td", {}, remove(outcome.visits, at, visit.label, `${path}.visits[${at}]`))))));
}

function columnSelect(object, path) {
  const select = make("select", { "aria-label": "Column", "data-path": path, "data-key": path, on: { change: () => {
    object.column = select.value;
    changed(true);
  } } }, form.guess.columns.flatMap(placesOf).map((name) => make("option", { value: name, selected: name === object.column }, name)));
  if (!column(object.column)) select.selectedIndex = -1;
  return select;
}

function seen(name) {
  const one = column(name);
  if (!one) return "";
  const parts = [`${one.filled} filled, ${one.blank} blank`];
  if (one.numbers && one.low !== null && one.low !== undefined) parts.push(`${one.low} to ${one.high}`);
  if (one.unreadable && one.numbers > one.unreadable) parts.push(`${one.unreadable} unreadable`);
  return `${name}: ${parts.join(", ")}`;
}

function outcomeCard(outcome, at) {
  const { plan } = form;
  const path = `outcomes[${at}]`;
  return make("section", { class: "card", "aria-label": `Outcome ${outcome.label || at + 1}`, "data-at": path },
    make("header", {}, make("h4", {}, outcome.label || "New outcome"), remove(plan.outcomes, at, outcome.label || "this outcome", path)),
    make("div", { class: "fields" }, textField("Name", outcome, "label", `${path}.label`, { wide: true }), textField("Short id", outcome, "id", `${path}.id`), textField("Unit", outcome, "unit", `${path}.unit`),
      choice("Role", [["primary", "primary"], ["secondary", "secondary"]], outcome.role, `${path}.role`, (value) => {
        if (value === "primary") for (const other of plan.outcomes) other.role = "secondary";
        outcome.role = value;
        changed(true);
      }),
      choice("Better is", [["lower", "lower"], ["higher", "higher"]], outcome.better, `${path}.better`, (value) => {
        outcome.better = value;
        changed(false);
      }),
      choice("Scale", [["linear", "linear"], ["log10", "log10: ratios"]], outcome.scale ?? "linear", `${path}.scale`, (value) => {
        outcome.scale = value;
        changed(false);
      }),
      numberField(outcome.scale === "log10" ? "Important difference, a ratio" : "Important difference", outcome, "important_difference", `${path}.important_difference`),
      rangeFields("Plausible", outcome, "plausible", `${path}.plausible`)),
    visitRows(outcome, path),
    make("p", { class: "hint" }, outcome.visits.map((visit) => seen(visit.column)).filter(Boolean).join(" · "), outcome.visits.length === 1 ? " · With one visit there is no baseline to adjust for." : ""),
    add("Add a visit", `${path}.add`, () => {
      // What stood alone was called a follow-up; with a later visit behind it, it is the baseline.
      if (outcome.visits.length === 1 && outcome.visits[0].label === alone) outcome.visits[0].label = "Baseline";
      outcome.visits.push({ label: `Visit ${outcome.visits.length + 1}`, column: "" });
    }));
}

function covariateCard(covariate, at) {
  const { plan } = form;
  const path = `covariates[${at}]`;
  const category = covariate.kind !== "number";
  return make("section", { class: "card", "aria-label": `Covariate ${covariate.label || at + 1}`, "data-at": path },
    make("header", {}, make("h4", {}, covariate.label || "New covariate"), remove(plan.covariates, at, covariate.label || "this covariate", path)),
    make("div", { class: "fields" }, textField("Name", covariate, "label", `${path}.label`), textField("Short id", covariate, "id", `${path}.id`), columnField("Column", covariate, "column", `${path}.column`),
      choice("Kind", [["number", "number"], ["category", "category"]], covariate.kind, `${path}.kind`, (value) => {
        covariate.kind = value;
        for (const key of ["levels", "eligible", "plausible", "bands", "unit"]) delete covariate[key];
        if (value === "category") covariate.levels = levelsOf(covariate.column);
        changed(true);
      }),
      category ? null : [textField("Unit", covariate, "unit", `${path}.unit`), rangeFields("Eligible", covariate, "eligible", `${path}.eligible`), rangeFields("Plausible", covariate, "plausible", `${path}.plausible`),
        listField("Cut points of bands", covariate, "bands", `${path}.bands`, number)]),
    make("p", { class: "hint" }, seen(covariate.column)),
    category ? [levelRows(covariate.levels ?? (covariate.levels = []), `${path}.levels`), add("Add a level", `${path}.add`, () => covariate.levels.push({ code: "", label: "" }))] : null);
}

const levelsOf = (name) => (column(name)?.values ?? []).filter((value) => value.listed).map((value) => ({ code: value.text, label: value.label ?? value.text }));

function eventCard(event, at) {
  const { plan } = form;
  const path = `events[${at}]`;
  return make("section", { class: "card", "aria-label": `Event ${event.label || at + 1}`, "data-at": path },
    make("header", {}, make("h4", {}, event.label || "New event"), remove(plan.events, at, event.label || "this event", path)),
    make("div", { class: "fields" }, textField("Name", event, "label", `${path}.label`), textField("Short id", event, "id", `${path}.id`), columnField("Column", event, "column", `${path}.column`),
      listField("Means yes", event, "yes", `${path}.yes`), listField("Means no", event, "no", `${path}.no`)),
    make("p", { class: "hint" }, seen(event.column)));
}

const alone = "Follow-up"; // the label of an outcome's only visit, which is no baseline

const newOf = {
  outcome: (name) => {
    const one = column(name);
    if (one.layout === "visit") {
      form.plan.outcomes.push({ id: unique(idOf(name.slice(one.file.length + 1))), label: one.label ?? name, unit: one.unit ?? "", role: form.plan.outcomes.length ? "secondary" : "primary",
        better: "lower", scale: "linear", visits: codesOf(one).map(({ code, label: words }) => ({ label: words, column: `${name}@${code}` })) });
      return;
    }
    const found = series(name);
    form.plan.outcomes.push({ id: unique(idOf(found?.id ?? name)), label: found?.label ?? column(name).label ?? name, unit: column(name).unit ?? "", role: form.plan.outcomes.length ? "secondary" : "primary",
      better: "lower", scale: "linear", visits: [{ label: alone, column: name }] });
  },
  number: (name) => form.plan.covariates.push({ id: unique(idOf(name)), label: column(name).label ?? name, column: placesOf(column(name))[0], kind: "number" }),
  category: (name) => form.plan.covariates.push({ id: unique(idOf(name)), label: column(name).label ?? name, column: placesOf(column(name))[0], kind: "category", levels: levelsOf(name) }),
  event: (name) => {
    const values = (column(name).values ?? []).map((value) => value.text);
    const yes = values.filter((value) => /^(y|yes|1|true|j|ja|oui|si)$/i.test(value));
    form.plan.events.push({ id: unique(idOf(name)), label: column(name).label ?? name, column: placesOf(column(name)).at(-1), yes, no: values.filter((value) => !yes.includes(value)) });
  },
};

function unique(id) {
  const taken = new Set([...form.plan.outcomes, ...form.plan.covariates, ...form.plan.events].map((one) => one.id));
  let at = 1;
  let result = id;
  while (taken.has(result)) result = `${id}_${++at}`;
  return result;
}

// --- the files and how they lie ------------------------------------------------------------------------------------------

// Guesses again with what was said of the files; what says nothing of columns is kept as it was typed.
async function guessAgain(files, key) {
  try {
    const answer = await server.post("/guesses", { draft: form.draft, files: files.map((file) => ({ name: file.name, ...form.said.get(file.name) })) });
    taken(answer, []);
  } catch (fault) {
    form.fault = fault.message;
    draw();
  }
  restoreFocus(`[data-key="${CSS.escape(key)}"]`, $("main").querySelector("[data-key=add-file]"));
}

function taken(answer, refused) {
  const { title, blinding, confidence, missing_baseline } = form.plan;
  Object.assign(form, { guess: answer.guess, draft: answer.draft, plan: { ...complete(answer.plan), title, blinding, confidence, missing_baseline }, fault: refused.join(" ") || null });
  draw();
}

async function addFiles(files) {
  const note = form.element.querySelector(".files-note");
  const { answer, refused } = await sendFiles(files, { draft: form.draft }, (words) => (note.textContent = words));
  if (answer.guess && form.said.size) {
    form.guess = answer.guess;
    await guessAgain(form.guess.files, "add-file");
    if (refused.length) fill($("plan-trouble"), refused.join(" "));
  } else if (answer.guess) {
    taken(answer, refused);
  } else {
    note.textContent = "";
    form.fault = refused.join(" ");
    fill($("plan-trouble"), form.fault);
  }
}

function fileCard(file) {
  const { files } = form.guess;
  const at = form.plan.files?.findIndex((one) => one.id === file.id) ?? 0;
  const path = `files[${at}]`;
  const say = (key, value, more) => {
    form.said.set(file.name, { ...form.said.get(file.name), [key]: value, ...more });
    guessAgain(files, `${path}.${key}`);
  };
  const names = file.columns.map((name) => [name, name]);
  const facts = [count(file.records, "record"), count(file.columns.length, "column"), file.participant ? count(file.participants, "participant") : "no identifier found",
    files.length > 1 && !file.first ? `${file.shared} of them in ${files.find((one) => one.first).name}` : null, files.length > 1 && file.first ? "has every participant" : null];
  const codes = make("input", { value: file.codes.map(({ code }) => code).join(", "), autocomplete: "off", "data-path": `${path}.codes`, "data-key": `${path}.codes`,
    on: { change: () => say("codes", codes.value.split(",").map((part) => part.trim()).filter((part) => part !== "")) } });
  return make("section", { class: "card", "aria-label": `File ${file.name}`, "data-at": path, "data-file": file.name },
    make("header", {}, make("h4", {}, file.name), files.length > 1 ? button("Remove", () => {
      form.said.delete(file.name);
      guessAgain(files.filter((one) => one !== file), "add-file");
    }, { class: "quiet", "aria-label": `Remove ${file.name}`, "data-key": `${path}.remove` }) : null),
    make("p", { class: "hint" }, facts.filter(Boolean).join(", ")),
    make("div", { class: "fields" },
      choice("One row for each", [["participant", "participant"], ["visit", "participant and visit"]], file.layout, `${path}.layout`, (value) => say("layout", value), true),
      files.length > 1 || file.layout === "visit" ? choice("Identifier", names, file.participant ?? "", `${path}.participant`, (value) => say("participant", value)) : null,
      file.layout === "visit" ? choice("Code of the visit", names, file.visit ?? "", `${path}.visit`, (value) => say("visit", value, { layout: "visit", codes: undefined })) : null,
      file.layout === "visit" ? label("Visits planned, in order of time", codes, true) : null));
}

function filesPart() {
  const input = make("input", { type: "file", id: "more-files", multiple: true, accept: accepted, class: "unseen", tabindex: "-1", "aria-label": "More files", on: { change: () => addFiles([...input.files]) } });
  const several = form.guess.files.length > 1;
  return make("fieldset", {}, make("legend", {}, several ? "The files" : "The file"),
    make("p", { class: "hint", "data-at": "files" }, several ? "The others are joined to the file that has every participant by their identifiers. Saying otherwise guesses the form again." : "Saying otherwise guesses the form again."),
    form.guess.files.map(fileCard),
    make("p", {}, button("Add a file", () => input.click(), { class: "quiet", "data-key": "add-file" }), " or drop it on the page. ", input, make("span", { class: "files-note", role: "status" })));
}

function columnsPart() {
  const used = uses();
  const example = (one) => (one.values ?? []).slice(0, 4).map((value) => value.text).join(", ");
  return make("fieldset", {}, make("legend", {}, form.guess.files.length > 1 ? "The columns" : `The columns of ${form.guess.name ?? "the file"}`),
    make("p", { class: "hint" }, form.guess.files.length > 1 ? `${count(form.guess.columns.length, "column")} of ${form.guess.files.length} files. ` : null, `What stands below is a guess from names and values: look at each. Columns without a meaning stay in the study file and are not analysed.`),
    make("div", { class: "scroll" }, make("table", { class: "table columns-table" },
      make("thead", {}, make("tr", {}, ["Column", "Filled", "For example", "Means"].map((words) => make("th", { scope: "col", class: words === "Filled" ? "number" : null }, words)))),
      make("tbody", {}, form.guess.columns.map((one) => make("tr", {}, make("th", { scope: "row" }, one.name), make("td", { class: "number" }, String(one.filled)),
        make("td", {}, one.numbers > 12 && one.low !== null ? `${one.low} to ${one.high}` : example(one)),
        make("td", {}, used.get(one.name)?.join("; ") ?? choice("", [["", "nothing"], ["outcome", "an outcome"], ["number", "a covariate, number"], ["category", "a covariate, category"], ["event", "an event"]], "",
          `use.${one.name}`, (value) => {
            if (value) newOf[value](one.name);
            changed(true);
          }))))))));
}

function draw() {
  const { plan } = form;
  const main = $("main");
  const key = main.contains(document.activeElement) ? document.activeElement.dataset.key : null;
  const typed = form.element ? { who: form.element.elements.who?.value, role: form.element.elements.role?.value } : {};
  form.pre = make("pre", { tabindex: "0", "aria-label": "The plan as JSON" });
  const trouble = make("div", { class: "trouble", role: "alert", id: "plan-trouble" });
  form.element = make("form", { novalidate: true, on: { submit: makeStudy } }, filesPart(), columnsPart(), trialPart(), armPart(),
    make("fieldset", {}, make("legend", {}, "Outcomes"), make("p", { class: "hint", "data-at": "outcomes" }, "Exactly one is primary. An outcome’s first visit is its baseline."), plan.outcomes.map(outcomeCard)),
    make("fieldset", {}, make("legend", {}, "Covariates"), make("p", { class: "hint" }, "Eligible: what the protocol admits. Plausible: beyond it a value is doubted. Bands: cut points such as 55, 65."), plan.covariates.map(covariateCard)),
    plan.events.length ? make("fieldset", {}, make("legend", {}, "Events"), plan.events.map(eventCard)) : null,
    make("fieldset", {}, make("legend", {}, "Missing values and the analysis"),
      make("div", { class: "fields" }, listField("Codes that stand for missing", plan, "missing_codes", "missing_codes", undefined, true),
        numberField("Confidence of intervals", plan, "confidence", "confidence"),
        choice("A missing baseline", [["mean", "takes the mean"], ["drop", "is left out"]], plan.missing_baseline ?? "mean", "missing_baseline", (value) => {
          plan.missing_baseline = value;
          changed(false);
        })),
      ticks("Adjust for", "adjust_for", "adjust_for", "beside the baseline: prognostic, measured before randomisation, named in the plan."),
      ticks("Subgroups", "subgroups", "subgroups", "named in the plan.")),
    trouble,
    make("p", { class: "actions" }, make("button", { type: "submit", class: "strong", "data-key": "make" }, "Make the study"), button("Save the plan", savePlan, { "data-key": "save-plan" }), button("Start again", form.back, { "data-key": "another" })));
  const side = make("aside", { class: "plan-side", "aria-label": "The plan" }, make("h3", {}, "The plan, as it will be kept"), form.pre, planFile());
  fill(main, make("h2", { class: "question", tabindex: "-1" }, "What do the columns mean?"), make("div", { class: "plan-form" }, form.element, side));
  if (typed.who && form.element.elements.who) {
    form.element.elements.who.value = typed.who;
    form.element.elements.role.value = typed.role;
  }
  changed(false);
  if (form.fault) fill($("plan-trouble"), form.fault);
  if (key) restoreFocus(`[data-key="${CSS.escape(key)}"]`);
}

function planFile() {
  const input = make("input", { type: "file", id: "plan-file", accept: ".json,application/json", class: "unseen", on: { change: () => take(input.files[0]) } });
  const place_of = make("p", {}, "A plan is there already? ", button("Choose its file", () => input.click(), { "data-key": "choose-plan" }), " or drop it here.", input);
  const take = async (file) => {
    if (!file) return;
    try {
      form.plan = complete(JSON.parse(await file.text()));
      form.fault = null;
      draw();
    } catch (error) {
      form.fault = `${file.name} is not a plan: ${error.message}.`;
      draw();
    }
  };
  takesDrops(place_of, (files) => {
    const plan = files.find((file) => /\.json$/i.test(file.name));
    if (plan) take(plan);
    else if (files.length) addFiles(files);
  });
  return place_of;
}

function savePlan() {
  const blob = new Blob([`${JSON.stringify(clean(form.plan), null, 2)}\n`], { type: "application/json" });
  const link = make("a", { href: URL.createObjectURL(blob), download: form.file.replace(/(\.study)?$/, "-plan.json") });
  link.click();
  setTimeout(() => URL.revokeObjectURL(link.href), 10000);
}

// --- faults, where they belong ---------------------------------------------------------------------------------------------

function pathOf(sentence) {
  const path = sentence.match(/\b(title|files|participant|arm|outcomes|covariates|events|missing_codes|adjust_for|subgroups|blinding|confidence|missing_baseline)((?:\[\d+\]|\.[a-z_]+)*)/)?.[0];
  if (path) return path;
  const name = sentence.match(/column "([^"]+)"/)?.[1];
  const field = name && [...form.element.querySelectorAll("select[data-path]")].find((select) => select.value === name);
  return field?.dataset.path ?? (/\.study\b/.test(sentence) ? "file" : "");
}

function place(sentence, path = pathOf(sentence)) {
  const note = make("p", { class: "fault" }, sentence);
  const field = path && form.element.querySelector(`[data-path="${CSS.escape(path)}"]`);
  let part = path;
  while (part && !field && !form.element.querySelector(`[data-at="${CSS.escape(part)}"]`)) part = part.replace(/(\[\d+\]|\.?[a-z_]+)$/, "");
  const at = field || (part && form.element.querySelector(`[data-at="${CSS.escape(part)}"]`)) || null;
  fill($("plan-trouble"), sentence);
  if (!at) return;
  if (field) {
    field.setAttribute("aria-invalid", "true");
    (field.closest(".fields, table, .ticks") ?? field).after(note);
  } else {
    at.append(note);
  }
  if (field) restoreFocus(`[data-path="${CSS.escape(path)}"]`);
}

// What can be said without asking the server: where, and what.
function missing() {
  const { plan } = form;
  if (!plan.title.trim()) return ["title", "The trial has no title yet."];
  if (!form.file.trim()) return ["file", "The study file needs a name."];
  const { who, role } = form.element.elements;
  if (who && (!who.value.trim() || !role.value.trim())) return ["who", "Say who is deciding: a name and a role go into the record."];
  const bare = (plan.files ?? []).findIndex((file) => !file.participant);
  if (bare >= 0) return [`files[${bare}].participant`, "Say which column identifies a participant."];
  if (!plan.participant) return ["participant", "Say which column identifies a participant."];
  if (!plan.outcomes.length) return ["outcomes", "Say which column is the primary outcome: choose it in the table of columns above."];
  const both = (list, name) => list.flatMap((one, at) => ["plausible", "eligible"].filter((key) => one[key]?.includes(null))
    .map((key) => [`${name}[${at}].${key}`, "A range needs both ends, or neither."]));
  return [...both(plan.outcomes, "outcomes"), ...both(plan.covariates, "covariates")][0] ?? null;
}

async function makeStudy(event) {
  event.preventDefault();
  for (const note of form.element.querySelectorAll(".fault")) note.remove();
  for (const field of form.element.querySelectorAll("[aria-invalid=true]")) field.removeAttribute("aria-invalid");
  const fault = missing();
  form.fault = fault?.[1] ?? null;
  if (fault) {
    place(fault[1], fault[0]);
    return;
  }
  takeWho(form.element);
  const submit = form.element.querySelector("[data-key=make]");
  submit.disabled = true;
  fill($("plan-trouble"), "Making the study…");
  try {
    const file = /\.study$/.test(form.file) ? form.file : `${form.file}.study`;
    await server.post("/studies", { draft: form.draft, file, plan: clean(form.plan), by: deciding.words() });
    await form.opened();
    restoreFocus(".question", $("main"));
  } catch (fault) {
    submit.disabled = false;
    form.fault = fault.message;
    place(fault.message);
  }
}
