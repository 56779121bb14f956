// What stands in place of the form once an entry is on this phone, until the server's own answer takes its place.
import { changeRecord, get } from "./waiting_store.js";
import { parsed } from "./phone.js";
import { form, freshen, untouched } from "./typing.js";
import { kindOf, placeOf, timeOf, wordsOf } from "./kinds.js";
import { checkOf } from "./check_kinds.js";
import { age } from "./check_words.js";

const template = document.querySelector("#kept");
const place = form()?.closest("section").id;
let shown;

function put(section) {
  document.getElementById(place).replaceWith(section);
  window.htmx?.process(section);
  section.querySelector("h1")?.focus();
  window.scrollTo(0, 0);
}

// What is about people stands before everything else.
function putFirst(view, line) {
  line.className = "notice bad";
  view.querySelector("h1").after(line);
}

// The sheet on this phone doesn't know what was read since it was fetched: the next station is the next one down.
function offerNext(link, pack, { kind, survey, code }) {
  const here = pack?.stations.findIndex((one) => one.code === code) ?? -1;
  const next = kind === "visit" ? pack?.stations[here] : pack?.stations[here + 1];
  link.hidden = here < 0 || !next || !navigator.serviceWorker?.controller;
  if (link.hidden) return;
  link.href = `/surveys/${survey}/stations/${encodeURIComponent(next.code)}/reading`;
  link.textContent = kind === "visit" ? `Read at ${next.code}` : `Next: ${next.code}`;
}

async function showKept({ detail: record }) {
  const view = template.content.firstElementChild.cloneNode(true);
  const at = (name) => view.querySelector(`[data-${name}]`);
  view.id = place;
  at("title").textContent = `${placeOf(record)}, ${timeOf(record)}`;
  at("again").textContent = wordsOf(record).again;
  at("again").addEventListener("click", () => again(record));
  const carries = Boolean(navigator.serviceWorker?.controller);
  at("leave").hidden = !carries;
  at("stay").hidden = carries;
  shown = record.id;
  put(view);
  const pack = await get("packs", record.survey).catch(() => undefined);
  if (kindOf(record) !== "check") offerNext(at("next"), pack, record);
  const check = pack && checkOf(pack, record);
  at("no-check").hidden = Boolean(check) || ["visit", "bottle"].includes(kindOf(record));
  if (!check) return;
  at("phone-check").hidden = false;
  at("oxygen").textContent = check.number ?? "";
  at("oxygen").parentElement.hidden = check.number === undefined;
  at("sentence").textContent = check.sentence;
  if (check.warns) putFirst(view, at("sentence").parentElement);
  at("age").textContent = age(pack);
  for (const [name, words] of check.lines) {
    const pair = ["dt", "dd"].map((tag) => document.createElement(tag));
    [pair[0].textContent, pair[1].textContent] = [name, words];
    at("facts").append(...pair);
  }
  // The page may be closed when the server answers: the record says what was shown.
  await changeRecord(record, { check });
}

function again(record) {
  if (!untouched) return location.reload();
  const section = parsed(untouched).getElementById(place);
  shown = undefined;
  put(section);
  freshen(form(), true);
  return document.dispatchEvent(new CustomEvent("bankside:again", { detail: record }));
}

// The server's answer takes the place of what this phone showed, and says where it differs.
function takeAnswer({ detail: { record, verdict, html } }) {
  if (shown !== record.id || !verdict.changes.state) return;
  const section = parsed(html).getElementById(place);
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
