// SPDX-License-Identifier: GPL-3.0-or-later
// Words for things that come as codes.

const months = ["Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec"];

export function day(iso) {
  const date = new Date(iso);
  if (Number.isNaN(date.getTime())) return iso;
  const year = date.getUTCFullYear() === new Date().getUTCFullYear() ? "" : ` ${date.getUTCFullYear()}`;
  return `${date.getUTCDate()} ${months[date.getUTCMonth()]}${year}`;
}

export function moment(iso) {
  const date = new Date(iso);
  if (Number.isNaN(date.getTime())) return iso;
  const two = (number) => String(number).padStart(2, "0");
  return `${day(iso)}, ${two(date.getUTCHours())}:${two(date.getUTCMinutes())} UTC`;
}

export const fingerprint = (hash) => (hash ? [0, 4, 8].map((at) => hash.slice(at, at + 4)).join("·") : "");
export const count = (number, one, many = `${one}s`) => `${number.toLocaleString("en-GB")} ${number === 1 ? one : many}`;
export const quoted = (text) => (text === null || text === undefined ? "missing" : text === "" ? "blank" : `“${text}”`);
// A space at either end would not be seen without quotation marks.
export const spaced = (text) => (text && text.trim() !== text ? quoted(text) : text);

// What the plan calls the columns, once it is known: {label, unit} by name of column.
export const columns = new Map();
const named = (column) => columns.get(column)?.label || column;

// A decision as a sentence, for previews and for what is said after it.
export function decisionWords(decision) {
  const at = decision.column ? ` in ${named(decision.column)}` : "";
  const of = decision.participant ? ` of ${decision.participant}` : "";
  switch (decision.kind) {
    case "read-as": return `Read ${quoted(decision.from)} as ${quoted(decision.to)} everywhere${at}`;
    case "missing-code": return `${quoted(decision.value)} stands for a missing value${at}`;
    case "number-format": return decision.decimal === "," ? `A comma is the decimal mark${at}` : `A point is the decimal mark${at}`;
    case "date-order": return `Dates${at}${decision.site ? ` of site ${decision.site}` : ""} are written ${decision.order}`;
    case "convert": return `Convert ${decision.column} at site ${decision.site}: times ${decision.factor} (${decision.unit_from} to ${decision.unit_to})`;
    case "correct": return `Correct ${named(decision.column)}${of} from ${quoted(decision.from)} to ${quoted(decision.to)}`;
    case "set-missing": return `Set ${named(decision.column)}${of} missing (it was ${quoted(decision.from)})`;
    case "confirm": return `Confirm ${named(decision.column)}${of} as recorded: ${quoted(decision.value)}`;
    case "keep-record": return `Record ${decision.row} stands for ${decision.participant}`;
    case "query": return `Ask the site about ${decision.column ? named(decision.column) : "the record"}${of}: ${decision.question}`;
    case "response": return `Answer to query ${decision.number}: ${decision.text}`;
    case "flag": return `Mark ${decision.participant} as doubtful for ${decision.outcome}`;
    case "scale": return `Analyse ${decision.outcome} on the ${decision.scale} scale`;
    case "attending": return `Attending: ${Array.isArray(decision.people) ? decision.people.join("; ") : decision.people}`;
    case "note": return "Note what the team concluded";
    case "unblind": return decision.to === "coded" ? "Show the arms as letters" : "Show the arms by name";
    case "reverse": return `Reverse decision ${decision.number}`;
    default: return decision.kind;
  }
}
