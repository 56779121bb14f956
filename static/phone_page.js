// The page about this phone: everything it keeps, what became of it, and what to do about it.
import { all, records } from "./waiting_store.js";
import { clock, person } from "./phone.js";
import { counted, isReading, placeOf, timeOf, valueOf } from "./kinds.js";
import { send } from "./sending.js";

const main = document.querySelector("main");
const part = (name) => main.querySelector(`[data-${name}]`);

function state(record) {
  if (record.state === "sent") {
    const differs = record.differs ? ` Its check differs from the phone's: ${record.differs}.` : "";
    return `On the server since ${clock(record.sentAt)}.${differs}`;
  }
  if (record.state === "refused") return `The server did not take it: ${record.reason}`;
  if (record.author !== person) return `Waits until ${record.authorName} signs in on this phone.`;
  return `Waits since ${clock(record.keptAt)}.`;
}

function card(record) {
  const item = document.querySelector("#waiting-record").content.firstElementChild.cloneNode(true);
  const value = valueOf(record);
  const title = `${placeOf(record)}, ${timeOf(record)}${value ? `: ${value}` : ""}, ${record.surveyName}`;
  item.querySelector("[data-title]").textContent = title;
  item.querySelector("[data-state]").textContent = state(record);
  const open = item.querySelector("[data-open]");
  const sentTo = record.shownAt || (isReading(record) ? `/surveys/${record.survey}/readings/${record.id}/check` : "");
  open.hidden = record.author !== person || (record.state === "sent" && !sentTo.startsWith("/surveys/"));
  open.textContent = record.state === "sent" && !isReading(record) ? "See it" : OPENS[record.state];
  open.href = record.state === "sent" ? sentTo : `${record.url}#waiting=${record.id}`;
  return item;
}

const OPENS = { sent: "See its check", refused: "Correct and save again", waiting: "Open it" };

async function show() {
  const kept = await records();
  const unsent = kept.filter((one) => one.state !== "sent");
  const sent = kept.filter((one) => one.state === "sent" && one.author === person).reverse();
  part("nothing").hidden = unsent.length > 0;
  part("unsent").replaceChildren(...unsent.map(card));
  part("send-now").hidden = unsent.length === 0;
  part("sent-part").hidden = sent.length === 0;
  part("sent").replaceChildren(...sent.map(card));
}

async function showPacks() {
  const packs = await all("packs");
  part("elsewhere").hidden = location.pathname === "/phone";
  part("packs-part").hidden = !packs.length;
  part("packs").replaceChildren(...packs.map((pack) => {
    const [item, link] = ["li", "a"].map((tag) => document.createElement(tag));
    link.href = `/surveys/${pack.survey}/sheet`;
    link.textContent = `${pack.name}: plan version ${pack.plan}, fetched ${clock(pack.made_at)}`;
    item.append(link);
    return item;
  }));
}

part("send-now").addEventListener("click", async () => {
  part("outcome").textContent = "Asking the server…";
  await send(true);
  const left = (await records()).filter((one) => one.state === "waiting" && one.author === person);
  part("outcome").textContent = left.length ? `${counted(left)} could not be sent yet.` : "All sent.";
});
document.addEventListener("bankside:waiting", show);
show();
showPacks();
