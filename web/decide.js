// SPDX-License-Identifier: GPL-3.0-or-later
// One form for every decision: what will happen, before and after, who, why, on what evidence; then the record.
import { button, fill, make, say } from "./page.js";
import * as server from "./server.js";
import { deciding, study } from "./study.js";
import { decisionWords } from "./words.js";

let serial = 0;

// Fields that ask who is deciding, where the session does not know yet or wants to say anew.
export function whoFields(force = false) {
  const known = deciding.get();
  if (known.name && !force) return null;
  const name = make("input", { name: "who", "data-path": "who", required: true, autocomplete: "off", value: known.name, maxlength: "120" });
  const role = make("input", { name: "role", required: true, autocomplete: "off", value: known.role, maxlength: "120" });
  return make("fieldset", { class: "who" }, make("legend", {}, "Who is deciding"),
    make("label", {}, make("span", {}, "Name"), name),
    make("label", {}, make("span", {}, "Role, as the record will say it"), role));
}

export function takeWho(form) {
  const name = form.elements.who?.value.trim();
  if (name !== undefined) deciding.set(name, form.elements.role.value.trim());
}

function fieldOf(field) {
  const attributes = { name: field.name, required: field.required !== false, value: field.value ?? "", autocomplete: "off" };
  let input;
  if (field.options) {
    input = make("select", { name: field.name, required: true },
      field.options.map((option) => make("option", { value: option.value, selected: option.value === field.value }, option.label)));
  } else if (field.long) {
    input = make("textarea", { ...attributes, rows: "3" });
  } else {
    input = make("input", attributes);
  }
  return make("label", {}, make("span", {}, field.label), input);
}

async function reasonsSoFar(list) {
  try {
    const reasons = new Set((await study.record()).map((decision) => decision.reason).filter(Boolean));
    fill(list, [...reasons].slice(-12).reverse().map((reason) => make("option", { value: reason })));
  } catch {
    // Suggestions only; the form works without them.
  }
}

function preview(spec, values) {
  const before = spec.before?.(values) ?? null;
  const after = spec.after?.(values) ?? null;
  return [
    before === null && after === null ? null : make("dl", { class: "preview" },
      make("div", {}, make("dt", {}, "Before"), make("dd", {}, before ?? "–")),
      make("div", {}, make("dt", {}, "After"), make("dd", {}, after ?? "–"))),
    spec.says ? make("p", { class: "says" }, spec.says(values)) : null,
  ];
}

// What the others have recorded while this form was open.
async function meanwhile(seen) {
  await study.moved();
  const news = (await study.record()).filter((decision) => decision.number > seen);
  return news.map((decision) => make("li", {}, `${decision.number}: ${decision.words ?? decisionWords(decision)} (${decision.by})`));
}

// spec: {title, fields, reason, before(values), after(values), says(values), alike: {count, words}, decisions(values),
//        action, done(version), cancel()}; values holds the fields by name, and `alike` where that box is ticked.
export function decisionForm(spec) {
  const id = `decision-${++serial}`;
  const shown = make("div", { "aria-live": "polite" });
  const trouble = make("div", { class: "trouble", role: "alert" });
  const reasons = make("datalist", { id: `${id}-reasons` });
  const submit = make("button", { type: "submit", class: "strong" }, spec.action ?? "Record the decision");
  const form = make("form", { class: "decision", "aria-labelledby": `${id}-title` },
    make("h3", { id: `${id}-title` }, spec.title),
    whoFields(),
    (spec.fields ?? []).map(fieldOf),
    shown,
    spec.alike ? make("label", { class: "tick" }, make("input", { type: "checkbox", name: "alike" }), make("span", {}, spec.alike.words)) : null,
    spec.reason === false ? null : make("label", {}, make("span", {}, "Reason"),
      make("input", { name: "reason", required: true, autocomplete: "off", list: `${id}-reasons`, maxlength: "2000" })),
    spec.reason === false ? null : make("label", {}, make("span", {}, "Evidence seen, if any ", make("small", {}, "(source document, page, date)")),
      make("input", { name: "evidence", autocomplete: "off", maxlength: "2000" })),
    reasons, trouble,
    make("p", { class: "buttons" }, submit, button("Cancel", () => spec.cancel?.())));
  const values = () => {
    const data = Object.fromEntries(new FormData(form));
    return { ...data, alike: data.alike === "on" };
  };
  const refresh = () => fill(shown, preview(spec, values()));
  let version = study.agenda.version;
  const send = async (event) => {
    event.preventDefault();
    const told = values();
    takeWho(form);
    const common = {};
    if (told.reason?.trim()) common.reason = told.reason.trim();
    if (told.evidence?.trim()) common.evidence = told.evidence.trim();
    const decisions = spec.decisions(told).map((decision) => ({ ...decision, ...common }));
    submit.disabled = true;
    fill(trouble);
    let said = "";
    try {
      const recorded = await server.post("/decisions", { version, by: deciding.words(), decisions });
      const first = decisionWords(decisions[0]);
      const last = recorded.version;
      said = decisions.length > 1 ? `Decisions ${last - decisions.length + 1} to ${last} recorded: ${first}, and ${decisions.length - 1} alike.`
        : `Decision ${last} recorded: ${first}.`;
      spec.done?.(last);
      await study.moved();
      say(said);
      spec.after_moved?.();
    } catch (fault) {
      submit.disabled = false;
      if (fault.status === 409) {
        const news = await meanwhile(version).catch(() => []);
        version = study.agenda.version;
        fill(trouble, make("p", {}, `${fault.message} Nothing of yours is lost: look at what happened, then record or cancel.`),
          news.length ? make("ul", {}, news) : null);
        submit.textContent = "Record it after these";
      } else {
        fill(trouble, make("p", {}, fault.message));
      }
      submit.focus();
    }
  };
  form.addEventListener("submit", send);
  form.addEventListener("input", refresh);
  form.addEventListener("keydown", (event) => {
    if (event.key === "Escape") {
      event.stopPropagation();
      event.preventDefault();
      spec.cancel?.();
    }
  });
  refresh();
  reasonsSoFar(reasons);
  return form;
}

export function focusForm(form) {
  const empty = [...form.elements].find((element) => element.matches("input:not([type=checkbox]), textarea, select") && !element.value);
  const box = form.closest("#panel");
  (empty ?? form.querySelector("button[type=submit]")).focus({ preventScroll: box !== null });
  if (!box) {
    form.scrollIntoView({ block: "nearest" });
    return;
  }
  // The panel stands still on the screen: only what is in it moves.
  const [inner, outer] = [form.getBoundingClientRect(), box.getBoundingClientRect()];
  box.scrollTop += Math.max(0, Math.min(inner.bottom - outer.bottom + 16, inner.top - outer.top - 16));
}

// The forms for one value of one participant. value: {column, label, unit, received, current, levels, kind}.
export function valueDecision(kind, participant, value, more) {
  const { column, current } = value;
  const name = value.label ?? column;
  const unit = value.unit ? ` ${value.unit}` : "";
  const typed = (text) => (text?.trim() ? worded(text.trim()) : null);
  const worded = (text) => (text === null || text === undefined ? "missing" : text === "" ? "blank" : text.trim() === text ? `${text}${unit}` : `“${text}”${unit}`);
  const base = { column, participant, ...(more.discrepancy ? { discrepancy: more.discrepancy } : {}) };
  const options = (value.levels ?? []).map((level) => ({ value: level.code, label: `${level.code} · ${level.label}` }));
  const forms = {
    correct: {
      title: `Correct ${name} of ${participant}`,
      fields: [{ name: "to", label: "Value at its source", options: options.length ? options : null, value: "" }],
      before: () => worded(current),
      after: (values) => typed(values.to),
      decisions: (values) => [{ kind: "correct", ...base, from: current, to: values.to.trim() }],
    },
    "set-missing": {
      title: `Set ${name} of ${participant} missing`,
      before: () => worded(current),
      after: () => "missing",
      says: () => "The value as received stays in the study file and in this panel.",
      decisions: () => [{ kind: "set-missing", ...base, from: current }],
    },
    confirm: {
      title: `Confirm ${name} of ${participant} as recorded`,
      before: () => worded(current),
      after: () => worded(current),
      says: () => "The value is used as it stands; the discrepancy is settled.",
      decisions: () => [{ kind: "confirm", ...base, value: current }],
    },
    query: {
      title: `Ask the site about ${name} of ${participant}`,
      fields: [{ name: "question", label: "Question to the site", long: true }],
      before: () => worded(current),
      after: () => `${worded(current)}, until the site answers`,
      decisions: (values) => [{ kind: "query", ...base, question: values.question.trim() }],
    },
    "read-as": {
      title: `Read ${worded(current)} as another value of ${name}`,
      fields: [{ name: "to", label: "Read it as", options: options.length ? options : null, value: "" }],
      before: () => worded(current),
      after: (values) => typed(values.to),
      says: () => `Holds for every ${worded(current)} in this column, not for ${participant} alone.`,
      decisions: (values) => [{ kind: "read-as", column, from: current, to: values.to.trim(),
        ...(more.discrepancy ? { discrepancy: more.discrepancy } : {}) }],
    },
  };
  return { ...forms[kind], ...more };
}
