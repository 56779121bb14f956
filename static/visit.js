// The visit form on this phone: the wading warning as it is typed, leaving, and going on with a visit without signal.
import { get, records, remove } from "./waiting_store.js";
import { dayClock, nowIn, person } from "./phone.js";
import { draftKey, fill, form, freshen, say } from "./typing.js";
import { wadingOf } from "./check_kinds.js";

const NOT_REPEATED = ["submission_id", "author_id", "saved_at", "visit_id", "seen", "reason"];

// With signal the server's own words take the place of these.
async function warn(it) {
  const pack = await get("packs", it.dataset.survey);
  const found = pack && wadingOf(pack, Object.fromEntries(new FormData(it)));
  const place = document.querySelector("#wading");
  const line = document.createElement("p");
  const notice = document.createElement("div");
  notice.className = `notice ${found?.warns ? "bad" : ""}`;
  line.textContent = found?.sentence ?? "";
  notice.append(line);
  place.replaceChildren(...(found ? [notice] : []));
}

const visitOf = (record) => record.fields.visit_id || record.id;

// What this phone saved about the visit that goes on at this station, the latest last; nothing once it has ended.
async function savedOf(it) {
  const url = it.getAttribute("action");
  const mine = (await records()).filter((one) => one.kind === "visit" && one.url === url && one.author === person);
  const last = mine.at(-1);
  if (!last || last.state === "refused" || last.fields.left_at || Date.now() - last.keptAt > 12 * 3600000) return [];
  return mine.filter((one) => visitOf(one) === visitOf(last));
}

function seenWith(it, saved) {
  const seen = JSON.parse(it.elements.seen.value || "[]");
  return JSON.stringify([...new Set([...seen, ...saved.map((one) => one.id)])].sort());
}

function goOn(it, saved) {
  const last = saved.at(-1);
  const kept = Object.entries(last.fields).filter(([name]) => !NOT_REPEATED.includes(name));
  const same = it.elements.visit_id.value === visitOf(last);
  it.elements.seen.value = seenWith(same ? it : begun(it), saved);
  it.elements.visit_id.value = visitOf(last);
  fill(it, Object.fromEntries(kept));
  it.closest("section").querySelector("h1").textContent = `Your visit at ${last.code}`;
  say(`It began ${dayClock(last.fields.arrived_at)}; what you add belongs to it. Begin afresh for another visit.`);
  warn(it);
}

// The form as that of another visit: empty but for who is here.
function begun(it) {
  const { crew } = it.elements;
  for (const field of it.querySelectorAll("input:not([type=hidden]), select, textarea")) {
    if (field !== crew) field.value = "";
  }
  it.elements.visit_id.value = "";
  it.elements.seen.value = "[]";
  it.elements.arrived_at.value = nowIn(it.dataset.zone);
  return it;
}

function another(it) {
  freshen(begun(it));
  it.querySelector("[data-goes-on]")?.remove();
  it.querySelector("[data-phone-says]").hidden = true;
  it.closest("section").querySelector("h1").textContent = `Arrive at ${it.dataset.code}`;
  document.querySelector("#wading").replaceChildren();
}

async function prepare(asked) {
  const it = form();
  if (!it) return;
  it.querySelector("[data-leaves-now]").hidden = false;
  const half = await get("drafts", draftKey(it));
  if (half || location.hash.includes("waiting=") || !(asked || "kept" in document.documentElement.dataset)) return;
  const saved = await savedOf(it);
  if (saved.length) goOn(it, saved);
}

document.addEventListener("input", ({ target }) => { if (target.closest("[data-wades]")) warn(form()); });
document.addEventListener("click", (event) => {
  if (event.target.closest("[data-leaves-now]")) {
    form().elements.left_at.value = nowIn(form().dataset.zone);
    form().elements.left_at.dispatchEvent(new Event("input", { bubbles: true }));
  }
  const onPhone = "kept" in document.documentElement.dataset && event.target.closest("[data-begin-afresh]");
  if (!onPhone && !event.target.closest("[data-another]")) return;
  event.preventDefault();
  event.stopPropagation();
  remove("drafts", draftKey(form())).catch(() => {});
  another(form());
}, true);
document.addEventListener("bankside:again", () => prepare(true));
document.addEventListener("htmx:afterSettle", () => { if (form()) form().querySelector("[data-leaves-now]").hidden = false; });
prepare(false);
