// SPDX-License-Identifier: GPL-3.0-or-later
// The first page, where no study is open: the studies of the folder, and a place to drop an export.
import { $, button, fill, make, restoreFocus } from "./page.js";
import { showPlanForm } from "./plan-form.js";
import * as server from "./server.js";
import { study } from "./study.js";

const care = "For use by people qualified to analyse trials, beside the approved protocol and analysis plan. Not a basis for " +
  "treating any one patient. Does not replace the duties of sponsor, investigator, ethics committee, data monitoring committee " +
  "or regulator; local law and data-protection rules come first. Question a value at its source before correcting it.";

export function showStart(opened) {
  const { agenda } = study;
  const trouble = make("div", { class: "trouble", role: "alert" });
  fill($("top"), make("h1", {}, "Evenhand"), make("p", { class: "facts" }, make("span", {}, "no study is open"), make("span", {}, `folder: ${agenda.folder ?? ""}`)));
  document.title = "Evenhand";
  fill($("main"),
    make("h2", { class: "question", tabindex: "-1" }, "From a trial’s export to its baseline-adjusted effect"),
    make("p", { class: "lead" }, "Open a study that is there, or make one from an export. Nothing leaves this machine."),
    trouble,
    make("div", { class: "start" }, studies(agenda, trouble, opened), dropPlace(trouble, opened)),
    make("aside", { class: "care", "aria-label": "Words of care" }, agenda.care ?? care));
}

function studies(agenda, trouble, opened) {
  const open = async (file) => {
    fill(trouble);
    try {
      await server.post("/open", { file });
      await opened();
      restoreFocus(".question", $("main"));
    } catch (fault) {
      fill(trouble, fault.message);
    }
  };
  return make("section", { "aria-labelledby": "studies-title" }, make("h3", { id: "studies-title" }, "Studies in this folder"),
    agenda.studies?.length
      ? make("ul", { class: "plain studies" }, agenda.studies.map((file) => make("li", {}, make("span", {}, file),
        button("Open", () => open(file), { "data-key": `open-${file}`, "aria-label": `Open ${file}` }))))
      : make("p", {}, `There is none yet in ${agenda.folder ?? "this folder"}. Drop an export to make the first.`));
}

export const accepted = ".csv,.txt,.tsv,text/csv,.xlsx,.xpt,.sav,.zsav,.por,.dta,.sas7bdat";

// Sends files one by one into one draft, each answer about all of them so far. Gives the last answer (the one given where none
// was taken) and the sentences of those that were refused.
export async function sendFiles(files, answer, tell) {
  const refused = [];
  for (const file of files) {
    tell(`Reading ${file.name}, ${(file.size / 1024).toLocaleString("en-GB", { maximumFractionDigits: 0 })} KB…`);
    try {
      answer = await server.post(`/drafts?name=${encodeURIComponent(file.name)}${answer ? `&draft=${answer.draft}` : ""}`, file);
    } catch (fault) {
      refused.push(fault.message);
    }
  }
  return { answer, refused };
}

function dropPlace(trouble, opened) {
  const progress = make("p", { class: "wait", role: "status" });
  const input = make("input", { type: "file", id: "export", multiple: true, accept: accepted, class: "unseen", tabindex: "-1", "aria-label": "Files of an export", on: { change: () => take([...input.files]) } });
  const place = make("section", { class: "drop", "aria-labelledby": "drop-title" },
    make("h3", { id: "drop-title" }, "Drop an export here"),
    make("p", {}, "One file or several of one trial, each with a header and one row for each participant, or one for each participant and visit. Comma, semicolon or tab; UTF-8, UTF-16 or Windows-1252; spreadsheets and common statistical files too. Doubtful values are welcome: they are listed, not refused."),
    make("p", {}, button("Choose files", () => input.click(), { class: "strong", "data-key": "choose-export" }), input), progress);
  const take = async (files) => {
    if (!files.length) return;
    fill(trouble);
    const { answer, refused } = await sendFiles(files, null, (words) => (progress.textContent = words));
    if (answer) {
      showPlanForm(answer, opened, () => showStart(opened), refused);
    } else {
      progress.textContent = "";
      input.value = "";
      fill(trouble, refused.join(" "));
    }
  };
  takesDrops(place, take);
  return place;
}

// Files dropped on the element, or anywhere on the page while the element is there.
export function takesDrops(place, take) {
  const over = (event) => {
    if (!event.dataTransfer?.types.includes("Files")) return;
    event.preventDefault();
    place.classList.toggle("over", place.contains(event.target));
  };
  const drop = (event) => {
    if (!place.isConnected) {
      document.removeEventListener("dragover", over);
      document.removeEventListener("drop", drop);
      return;
    }
    event.preventDefault();
    place.classList.remove("over");
    take([...event.dataTransfer.files]);
  };
  document.addEventListener("dragover", over);
  document.addEventListener("drop", drop);
}
