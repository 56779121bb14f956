// A form that may wait on this phone: what is typed is kept as it is typed, and is there again when the page comes back.
import { get, put, remove } from "./waiting_store.js";
import { clock, newId, nowIn, person } from "./phone.js";
import { timeFields } from "./kinds.js";

export const form = () => document.querySelector("form[data-waiting]");
// The form as it came: without a worker no page can be opened without signal, so the next entry begins from this.
export const untouched = form()?.hasAttribute("data-fresh") ? form().closest("section").outerHTML : "";
export const draftKey = (it) => `${person} ${it.getAttribute("action")}`;

// Everything a form holds, with the answer that was pressed, but without the token of this session.
export function fieldsOf(it, button) {
  const fields = Object.fromEntries(new FormData(it));
  if (button?.name === "keep") fields.keep = button.value;
  delete fields.csrf_token;
  return fields;
}

export function fill(it, fields) {
  for (const [name, text] of Object.entries(fields)) {
    const field = it.elements[name];
    if (!field || name === "csrf_token" || name === "keep") continue;
    if (field.type === "checkbox") field.checked = Boolean(text);
    else field.value = text;
  }
  const changed = (field) => field.type !== "hidden" && field.value !== field.defaultValue;
  for (const fold of it.querySelectorAll("details")) {
    if ([...fold.querySelectorAll("input, textarea")].some(changed)) fold.open = true;
  }
}

export function say(words) {
  const line = form()?.querySelector("[data-phone-says]");
  if (!line) return;
  line.querySelector("span").textContent = words;
  line.hidden = false;
}

export function cannotKeep() {
  say("This phone keeps nothing for this page. Save only with signal, and write the numbers on paper too.");
}

// A page that comes from a cache carries the id of an entry that may be stored by now, and the time of that hour.
export function freshen(it, fromPhone) {
  it.elements.submission_id.value = newId();
  const time = timeFields.map((name) => it.elements[name]).find(Boolean);
  if (fromPhone && time && !it.elements.visit_id?.value) time.value = nowIn(it.dataset.zone);
  it.removeAttribute("data-fresh");
}

async function bringBack(it) {
  const asked = new URLSearchParams(location.hash.slice(1)).get("waiting");
  const record = asked && (await get("waiting", asked));
  if (record && record.author === person && record.state !== "sent") {
    const empty = Object.fromEntries([...new FormData(it).keys()].map((name) => [name, ""]));
    fill(it, { ...empty, ...record.fields });
    return say(record.reason || "This waits on this phone. Save it again to change it.");
  }
  const draft = await get("drafts", draftKey(it));
  if (!draft) return;
  fill(it, draft.fields);
  say(`What you typed at ${clock(draft.at)} is back.`);
}

export async function begin() {
  const it = form();
  if (!it?.hasAttribute("data-fresh")) return;
  freshen(it, "kept" in document.documentElement.dataset);
  await bringBack(it).catch(cannotKeep);
}

function keepTyping({ target }) {
  const it = target.closest?.("form[data-waiting]");
  if (it) put("drafts", { key: draftKey(it), fields: fieldsOf(it), at: Date.now() }).catch(cannotKeep);
}

async function beginAfresh() {
  await remove("drafts", draftKey(form()));
  history.replaceState(history.state, "", location.pathname);
  location.reload();
}

if (person) {
  document.addEventListener("input", keepTyping);
  document.addEventListener("click", ({ target }) => { if (target.closest("[data-begin-afresh]")) beginAfresh(); });
  document.addEventListener("htmx:historyRestore", begin);
  begin();
}
