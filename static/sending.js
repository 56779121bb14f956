// Sends what waits on this phone: one sender at a time, each record until the server has named its id as stored.
import { changeRecord, get, inStore, records } from "./waiting_store.js";
import { differences } from "./check_words.js";
import { ask, newId, parsed, phone } from "./phone.js";

const MINUTE = 60000;
const LEASE_MS = 40000;
const tab = newId();
let failures = 0;
let busy = false;
let again;
let timer;

// Web Locks end with their tab; where they are missing, on plain HTTP, a lease in the database does.
async function alone(work) {
  if (navigator.locks) return navigator.locks.request("bankside-sender", { ifAvailable: true }, (lock) => lock && work());
  let mine = false;
  await inStore("facts", "readwrite", (store) => {
    store.get("sender").onsuccess = ({ target: { result } }) => {
      mine = !result || result.tab === tab || result.until < Date.now();
      if (mine) store.put({ key: "sender", tab, until: Date.now() + LEASE_MS });
    };
  });
  return mine ? work() : undefined;
}

// Who is signed in, and a token that fits: null without an answer. A page may be older than its session.
export async function whoIsHere() {
  const answer = await ask(phone.dataset.here, { headers: { "HX-Request": "true" } });
  const here = answer && parsed(answer.html).querySelector("[data-here]");
  return here ? { person: here.dataset.person, token: here.dataset.token, html: answer.html } : null;
}

export function reasons(html) {
  const page = parsed(html);
  const said = [...page.querySelectorAll(".ask strong, p.error:not([hidden]), .notice.bad p, main h1 + p")];
  return [...new Set(said.map((one) => one.textContent.trim()).filter(Boolean))].join(" ").slice(0, 600);
}

// What an answer means for a record: changes to it, and whether the round can go on.
export function judge(record, { status, stored, owner, address, shownAt, html, wait }) {
  const sent = { state: "sent", sentAt: Date.now(), shownAt: shownAt ?? "", reason: "" };
  if (stored === record.id) return { changes: sent, goOn: true };
  if (owner) return { changes: { author: record.fields.author_id }, goOn: true };
  if (address.includes("/sign-in") || status === 400 || status === 401) return { changes: {}, signedOut: true };
  if (status >= 400 && status < 500 && status !== 408 && status !== 429) {
    const reason = reasons(html) || `The server answered ${status}.`;
    return { changes: { state: "refused", reason }, goOn: true };
  }
  // A proxy's or a hotspot's page, or a server in trouble: it says nothing about the record.
  const tries = (record.tries ?? 0) + 1;
  const pause = Math.max(wait * 1000, Math.min(MINUTE, 1000 * 2 ** tries) * (0.5 + Math.random() / 2));
  return { changes: { tries, nextAt: Date.now() + pause }, goOn: status < 500 && status !== 429 };
}

async function sendOne(record, token) {
  const body = new URLSearchParams({ ...record.fields, csrf_token: token });
  const answer = await ask(record.url, { method: "POST", body, headers: { "HX-Request": "true" } });
  if (!answer) return { lost: true };
  const { reply, html } = answer;
  const header = (name) => reply.headers.get(name);
  const named = { stored: header("X-Stored-Id"), owner: header("X-Belongs-To"), shownAt: header("HX-Push-Url") };
  const said = { ...named, wait: Number(header("Retry-After")) || 0 };
  const verdict = judge(record, { status: reply.status, address: reply.url, html, ...said });
  const theirs = parsed(html).querySelector("[data-check]")?.dataset;
  if (verdict.changes.state === "sent") verdict.changes.differs = record.check ? differences(record.check, theirs) : "";
  await changeRecord(record, verdict.changes);
  document.dispatchEvent(new CustomEvent("bankside:answer", { detail: { record, verdict, html } }));
  return verdict;
}

async function round(now) {
  const due = (record) => record.state === "waiting" && (now || (record.nextAt ?? 0) <= Date.now());
  if (!(await records()).some(due)) return;
  const here = await whoIsHere();
  failures = here ? 0 : failures + 1;
  document.dispatchEvent(new CustomEvent("bankside:here", { detail: here }));
  if (!here?.person) return;
  for (const one of (await records()).filter((record) => due(record) && record.author === here.person)) {
    const record = await get("waiting", one.id);
    if (!record || !due(record)) continue;
    const outcome = await sendOne(record, here.token);
    if (outcome.lost) failures += 1;
    if (!outcome.goOn) return;
  }
}

// Without an answer the pauses grow to a minute, none alike: phones that meet signal together must not call together.
export async function send(now = false) {
  // What is asked for during a round is done after it, at once if so it was asked.
  if (busy) again = again === true || now === true;
  if (busy || !phone) return;
  busy = true;
  again = undefined;
  clearTimeout(timer);
  await alone(() => round(now === true)).catch((trouble) => console.warn("not sent", trouble));
  busy = false;
  const pause = failures ? Math.min(MINUTE, 2000 * 2 ** failures) * (0.5 + Math.random() / 2) : MINUTE;
  timer = setTimeout(send, again === undefined ? pause : 0, again);
}
