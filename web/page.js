// SPDX-License-Identifier: GPL-3.0-or-later
// Small helpers over the document: elements, what is said aloud, the one dialog, and keeping the focus when parts are redrawn.

export const $ = (id) => document.getElementById(id);

// make("a", {class: "x", href: "#y", on: {click: f}, hidden: true}, "text", element, [more], null)
export function make(tag, attributes, ...children) {
  const element = document.createElement(tag);
  for (const [name, value] of Object.entries(attributes ?? {})) {
    if (name === "on") {
      for (const [event, listener] of Object.entries(value)) element.addEventListener(event, listener);
    } else if (name === "value" || name === "checked" || name === "selected") {
      element[name] = value;
    } else if (value === true) {
      element.setAttribute(name, "");
    } else if (value !== false && value !== null && value !== undefined) {
      element.setAttribute(name, value);
    }
  }
  put(element, children);
  return element;
}

function put(element, children) {
  for (const child of children) {
    if (Array.isArray(child)) put(element, child);
    else if (child !== null && child !== undefined && child !== false) element.append(child);
  }
}

export function fill(element, ...children) {
  element.replaceChildren();
  put(element, children);
  return element;
}

export const button = (text, click, attributes) => make("button", { type: "button", ...attributes, on: { click } }, text);

// Says a sentence in the live region, where it also stays to be read; `after` may hold a button that belongs to it.
export function say(sentence, after) {
  $("live").textContent = sentence;
  fill($("after"), after, sentence ? button("Close", () => say(""), { class: "quiet", "aria-label": "Close this message" }) : null);
  $("said").classList.toggle("shown", sentence !== "");
}

let afterDialog = null;
export function openDialog(title, content, closed) {
  const dialog = $("dialog");
  if (dialog.open) dialog.close();
  const from = focusKey(document.activeElement);
  fill(dialog, make("header", {}, make("h2", { id: "dialog-title" }, title),
    button("Close", closeDialog, { class: "quiet", "data-key": "dialog-close" })), content);
  afterDialog = () => {
    restoreFocus(from);
    closed?.();
  };
  dialog.onclose = () => {
    const then = afterDialog;
    afterDialog = null;
    fill(dialog);
    then?.();
  };
  dialog.showModal();
  const first = content instanceof Element ? content.querySelector("input, textarea, select") : null;
  first?.focus();
}

export function closeDialog() {
  if ($("dialog").open) $("dialog").close();
}

// What to look for again once a part of the page has been redrawn.
export function focusKey(element) {
  if (!element || element === document.body) return null;
  const quote = (value) => CSS.escape(value);
  const data = element.dataset ?? {};
  if (element.id) return `#${quote(element.id)}`;
  if (data.key) return `[data-key="${quote(data.key)}"]`;
  if (data.participant) {
    return `[data-participant="${quote(data.participant)}"]` + (data.column ? `[data-column="${quote(data.column)}"]` : "");
  }
  if (element.closest?.("form.decision")) return `form.decision ${element.name ? `[name="${quote(element.name)}"]` : "button[type=submit]"}`;
  const tabs = element.closest?.("[data-argument]");
  if (tabs && data.value !== undefined) {
    return `[data-argument="${quote(tabs.dataset.argument)}"] [data-value="${quote(data.value)}"]`;
  }
  if (element.matches?.(".exhibit summary")) return `.${element.parentElement.className.split(" ")[0]} > summary`;
  return null;
}

export function restoreFocus(key, otherwise) {
  const element = (key && document.querySelector(key)) || otherwise;
  if (!element) return;
  if (!element.matches("a, button, input, select, textarea, summary, [tabindex]")) element.tabIndex = -1;
  element.focus({ preventScroll: false });
}

export const writing = (target) =>
  target instanceof Element && target.closest("input:not([type=radio]):not([type=checkbox]), textarea, select, [contenteditable]") !== null;
