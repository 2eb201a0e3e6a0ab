// SPDX-License-Identifier: GPL-3.0-or-later
// Requests to the program on this machine, and nowhere else. Whatever fails comes out as a Fault with a sentence.

export class Fault extends Error {
  constructor(sentence, status, more = {}) {
    super(asSentence(sentence));
    this.status = status;
    this.version = more.version;
    this.row = more.row;
  }
}

// The program's sentences also stand after "evenhand: " in a terminal; here they begin and end as sentences do. Names of
// files and columns keep their letters.
function asSentence(text) {
  const begun = /^[a-z]+ /.test(text) ? text[0].toUpperCase() + text.slice(1) : text;
  return /[.!?:]$/.test(begun) ? begun : `${begun}.`;
}

async function answer(request) {
  let reply;
  try {
    reply = await request;
  } catch (error) {
    if (error.name === "AbortError") throw error;
    throw new Fault("The program no longer answers. Start it again in the terminal, open the address it prints, and " +
      "everything recorded so far is there.", 0);
  }
  if (reply.ok) return reply;
  let said = {};
  try {
    said = await reply.json();
  } catch {
    // Not every refusal has a body; the status is said instead.
  }
  throw new Fault(said.fault ?? `The program refused this request (status ${reply.status}).`, reply.status, said);
}

export async function text(path, signal) {
  return (await answer(fetch(path, { signal, cache: "no-store" }))).text();
}

export async function json(path, signal) {
  return (await answer(fetch(path, { signal, cache: "no-store" }))).json();
}

export async function post(path, body) {
  const raw = body instanceof Blob;
  const reply = await answer(fetch(path, {
    method: "POST",
    headers: { "Content-Type": raw ? "application/octet-stream" : "application/json" },
    body: raw ? body : JSON.stringify(body),
  }));
  return reply.json();
}
