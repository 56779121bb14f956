// The line on every page: how much waits on this phone, since when, what was refused; and the sign-in over the page.
import { forgetOld, records } from "./waiting_store.js";
import { ask, clock, parsed, person, phone } from "./phone.js";
import { counted } from "./kinds.js";
import { send } from "./sending.js";
import { settlePerson } from "./whose.js";

const DAY_MS = 24 * 3600 * 1000;
const line = phone.querySelector("[data-waiting-line]");
const door = phone.querySelector("[data-door]");

function words(mine, others) {
  const waiting = mine.filter((one) => one.state === "waiting");
  const refused = mine.filter((one) => one.state === "refused");
  const said = [];
  if (waiting.length) {
    const old = Date.now() - waiting[0].keptAt > DAY_MS ? " That is more than a day: find signal, or save them as a file." : "";
    said.push(`${counted(waiting)} ${waiting.length === 1 ? "waits" : "wait"} on this phone, since ${clock(waiting[0].keptAt)}.${old}`);
  }
  if (refused.length) said.push(`${counted(refused)} ${refused.length === 1 ? "needs" : "need"} another look before the server takes it.`);
  for (const name of new Set(others.map((one) => one.authorName))) {
    const theirs = others.filter((one) => one.authorName === name);
    said.push(`${counted(theirs)} by ${name} ${theirs.length === 1 ? "waits" : "wait"} until they sign in.`);
  }
  return said.join(" ");
}

export async function show() {
  const unsent = (await records()).filter((one) => one.state !== "sent");
  const mine = unsent.filter((one) => one.author === person);
  const said = words(mine, unsent.filter((one) => one.author !== person));
  line.querySelector("a").textContent = said || "Nothing waits on this phone";
  line.classList.toggle("some", Boolean(said));
  line.hidden = false;
}

// Signed out, or somebody else is signed in: the list stays, and this page goes on once its person is back.
function openDoor({ detail: here }) {
  if (!here || here.person === person) return door.replaceChildren();
  if (here.person) {
    door.textContent = "Somebody else is signed in on this phone now. Open the page again to go on as them.";
    return undefined;
  }
  if (door.querySelector("form")) return undefined;
  door.replaceChildren(...parsed(here.html).querySelector("[data-here]").children);
  return door.querySelector("form").addEventListener("submit", signIn);
}

async function signIn(event) {
  event.preventDefault();
  const it = event.target;
  const answer = await ask(it.action, { method: "POST", body: new URLSearchParams(new FormData(it)) });
  const here = answer && parsed(answer.html).querySelector("[data-here]");
  if (here?.dataset.person) {
    door.replaceChildren();
    if (here.dataset.person !== person) return location.reload();
    return send();
  }
  const trouble = it.querySelector("[data-trouble]");
  const page = answer && parsed(answer.html);
  const said = page?.querySelector("p.error") ?? page?.querySelector("main h1 + p");
  trouble.textContent = said?.textContent ?? "The server did not answer. Try again in a moment.";
  trouble.hidden = false;
}

document.addEventListener("bankside:waiting", show);
document.addEventListener("bankside:here", openDoor);
document.addEventListener("visibilitychange", () => { if (document.visibilityState === "visible") send(); });
window.addEventListener("online", send);
window.addEventListener("pageshow", ({ persisted }) => { if (persisted) { show(); send(); } });
if ("kept" in document.documentElement.dataset) {
  const from = phone.querySelector("[data-from-phone]");
  from.textContent = `No answer from the server: this is the page as it was ${clock(Number(document.documentElement.dataset.kept))}.`;
  from.hidden = false;
}
settlePerson().then(forgetOld).then(show).then(send).catch(() => {
  line.querySelector("a").textContent = "This phone keeps nothing: save only with signal";
  line.classList.add("some");
  line.hidden = false;
});
