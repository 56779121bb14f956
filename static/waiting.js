// What is saved is written on this phone first and sent after: the server's answer says whether it may be let go.
import { changeRecord, keepRecord } from "./waiting_store.js";
import { whatOf } from "./kinds.js";
import { person, phone } from "./phone.js";
import { judge, send } from "./sending.js";
import { cannotKeep, draftKey, fieldsOf, fill } from "./typing.js";

// The form's own request gives up before the sender takes the record over.
const SENDER_LATER_MS = 20000;
let saving;

function recordOf(it, button) {
  const { survey, surveyName, code = "", kind = "reading" } = it.dataset;
  const fields = fieldsOf(it, button);
  return {
    v: 1,
    kind,
    what: whatOf(it),
    id: fields.submission_id,
    url: it.getAttribute("action"),
    survey,
    surveyName,
    code,
    fields: { ...fields, saved_at: new Date().toISOString() },
    author: fields.author_id || person,
    authorName: phone.dataset.name,
    keptAt: Date.now(),
    state: "waiting",
    reason: "",
    tries: 0,
    nextAt: Date.now() + SENDER_LATER_MS,
  };
}

async function keepFirst(event) {
  const it = event.target;
  if (!it.matches?.("form[data-waiting]")) return;
  event.preventDefault();
  if (saving) return;
  const button = event.detail.triggeringEvent?.submitter;
  if (button?.dataset.sets) fill(it, JSON.parse(button.dataset.sets));
  saving = recordOf(it, button);
  await keepRecord(saving, draftKey(it)).catch(() => {
    saving.lost = true;
    cannotKeep();
  });
  event.detail.issueRequest(true);
  it.inert = true; // what would be typed until the answer comes, the answer would take away again
}

async function answered({ detail: { requestConfig, xhr } }) {
  if (!saving || !requestConfig.elt.matches("form[data-waiting]")) return;
  requestConfig.elt.inert = false;
  const record = saving;
  saving = undefined;
  if (record.lost) return;
  const verdict = xhr.status ? judge(record, {
    status: xhr.status,
    stored: xhr.getResponseHeader("X-Stored-Id"),
    owner: xhr.getResponseHeader("X-Belongs-To"),
    address: xhr.responseURL,
    shownAt: xhr.getResponseHeader("HX-Push-Url"),
    html: xhr.responseText,
    wait: Number(xhr.getResponseHeader("Retry-After")) || 0,
  }) : { changes: {} };
  await changeRecord(record, { nextAt: 0, ...verdict.changes });
  if (verdict.changes.state) return;
  document.dispatchEvent(new CustomEvent("bankside:kept", { detail: record }));
  send();
}

if (person) {
  document.addEventListener("htmx:confirm", keepFirst);
  document.addEventListener("htmx:afterRequest", answered);
  // A sign-in page is no answer to a save.
  document.addEventListener("htmx:beforeSwap", (event) => {
    if (event.detail.xhr.responseURL.includes("/sign-in")) event.detail.shouldSwap = false;
  });
}
