// What stands in place of the form once a reading is on this phone, until the server's own answer takes its place.
import { parsed } from "./phone.js";
import { form, freshen, untouched } from "./typing.js";

const template = document.querySelector("#kept");
let shown;

function put(section) {
  document.querySelector("#reading").replaceWith(section);
  window.htmx?.process(section);
  section.querySelector("h1")?.focus();
  window.scrollTo(0, 0);
}

function showKept({ detail: record }) {
  const view = template.content.firstElementChild.cloneNode(true);
  const at = (name) => view.querySelector(`[data-${name}]`);
  at("title").textContent = `${record.code}, ${record.fields.taken_at.replace("T", " ")}`;
  at("again").addEventListener("click", again);
  shown = record.id;
  put(view);
}

function again() {
  if (!untouched) return location.reload();
  const section = parsed(untouched).querySelector("#reading");
  shown = undefined;
  put(section);
  return freshen(form(), true);
}

// The server's answer takes the place of what this phone showed.
function takeAnswer({ detail: { record, verdict, html } }) {
  if (shown !== record.id || !verdict.changes.state) return;
  const section = parsed(html).querySelector("#reading");
  if (!section) return;
  shown = undefined;
  put(section);
}

if (template) {
  document.addEventListener("bankside:kept", showKept);
  document.addEventListener("bankside:answer", takeAnswer);
}
