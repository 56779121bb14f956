// What stands in place of the form once a reading is on this phone, until the server's own answer takes its place.
import { changeRecord, get } from "./waiting_store.js";
import { parsed } from "./phone.js";
import { form, freshen, untouched } from "./typing.js";
import { checkOnPhone } from "./check.js";
import { age, facts, sentence } from "./check_words.js";

const template = document.querySelector("#kept");
let shown;

function put(section) {
  document.querySelector("#reading").replaceWith(section);
  window.htmx?.process(section);
  section.querySelector("h1")?.focus();
  window.scrollTo(0, 0);
}

// The sheet on this phone doesn't know what was read since it was fetched: the next station is the next one down.
function offerNext(link, pack, record) {
  const here = pack?.stations.findIndex((one) => one.code === record.code) ?? -1;
  const next = here >= 0 ? pack.stations[here + 1] : undefined;
  link.hidden = !next || !navigator.serviceWorker?.controller;
  if (!next) return;
  link.href = `/surveys/${record.survey}/stations/${encodeURIComponent(next.code)}/reading`;
  link.textContent = `Next: ${next.code}`;
}

async function showKept({ detail: record }) {
  const view = template.content.firstElementChild.cloneNode(true);
  const at = (name) => view.querySelector(`[data-${name}]`);
  at("title").textContent = `${record.code}, ${record.fields.taken_at.replace("T", " ")}`;
  at("again").addEventListener("click", again);
  const carries = Boolean(navigator.serviceWorker?.controller);
  at("leave").hidden = !carries;
  at("stay").hidden = carries;
  shown = record.id;
  put(view);
  const pack = await get("packs", record.survey).catch(() => undefined);
  offerNext(at("next"), pack, record);
  const check = pack && checkOnPhone(pack, record);
  at("no-check").hidden = Boolean(check);
  if (!check) return;
  at("phone-check").hidden = false;
  at("oxygen").textContent = check.oxygen.toFixed(2);
  at("sentence").textContent = sentence(check);
  at("age").textContent = age(pack);
  for (const [name, words] of facts(check)) {
    const [term, fact] = ["dt", "dd"].map((tag) => document.createElement(tag));
    term.textContent = name;
    fact.textContent = words;
    at("facts").append(term, fact);
  }
  // The page may be closed when the server answers: the record says what was shown.
  await changeRecord(record, { check });
}

function again() {
  if (!untouched) return location.reload();
  const section = parsed(untouched).querySelector("#reading");
  shown = undefined;
  put(section);
  return freshen(form(), true);
}

// The server's answer takes the place of what this phone showed, and says where it differs.
function takeAnswer({ detail: { record, verdict, html } }) {
  if (shown !== record.id || !verdict.changes.state) return;
  const section = parsed(html).querySelector("#reading");
  if (!section) return;
  const { differs } = verdict.changes;
  if (differs) {
    const line = document.createElement("p");
    line.className = "notice warn";
    line.textContent = `This replaces what the phone showed: ${differs}.`;
    section.querySelector("h1").after(line);
  }
  shown = undefined;
  put(section);
}

if (template) {
  document.addEventListener("bankside:kept", showKept);
  document.addEventListener("bankside:answer", takeAnswer);
}
