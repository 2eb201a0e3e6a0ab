// SPDX-License-Identifier: GPL-3.0-or-later
// All state of the screen stands in the address: #change-by-arm?outcome=sbp&by=sex&panel=Q2400&meeting=1
// so that reload, back and a pasted link give the same screen.

// Names that are the page's own; every other argument is the exhibit's.
const own = ["panel", "cell", "meeting", "show", "at"];

export function read(hash = location.hash) {
  const [name, query = ""] = hash.replace(/^#/, "").split("?");
  const place = { exhibit: decodeURIComponent(name), args: {}, panel: "", cell: "", meeting: false, show: "", at: "" };
  for (const [key, value] of new URLSearchParams(query)) {
    if (key === "meeting") place.meeting = value === "1";
    else if (own.includes(key)) place[key] = value;
    else place.args[key] = value;
  }
  return place;
}

export function write(place) {
  const query = new URLSearchParams(place.args);
  for (const key of own) {
    if (place[key]) query.set(key, key === "meeting" ? "1" : place[key]);
  }
  const text = query.toString();
  return `#${encodeURIComponent(place.exhibit)}${text ? `?${text}` : ""}`;
}

export const changed = (changes, place = read()) => write({ ...place, ...changes });
// The same screen with one argument of the exhibit said anew. Another outcome has other visits, scales and contrasts.
export function withArgument(name, value, place = read()) {
  const args = { ...place.args };
  if (name === "outcome") for (const other of ["visit", "scale", "arm"]) delete args[other];
  if (value === "") delete args[name];
  else args[name] = value;
  return write({ ...place, args });
}

export function go(hash) {
  if (hash !== location.hash) location.hash = hash;
}
// For small steps that the back button should not stop at.
export function slip(hash) {
  history.replaceState(null, "", hash);
}
// What is asked of the server for this screen.
export function question(place, kind = "") {
  const query = new URLSearchParams(place.args);
  if (place.meeting && kind !== ".csv" && kind !== ".json") query.set("meeting", "1");
  const text = query.toString();
  return `/exhibit/${encodeURIComponent(place.exhibit)}${kind}${text ? `?${text}` : ""}`;
}
