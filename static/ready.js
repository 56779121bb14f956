// "Make ready for the river", on the field sheet: fetch what a day without signal needs, check it, and say so.
import { get, records } from "./waiting_store.js";
import { clock } from "./phone.js";
import { counted } from "./kinds.js";
import { fetchPack, missing } from "./fieldpack.js";
import { hours } from "./check_words.js";

const section = document.querySelector("#ready");
const part = (name) => section.querySelector(`[data-${name}]`);
const { survey, address, plan } = section.dataset;
const fromPhone = "kept" in document.documentElement.dataset;

const say = (name, words) => {
  part(name).textContent = words;
  part(name).hidden = !words;
};

const age = (pack) => `plan version ${pack.plan}, fetched ${clock(pack.made_at)}, ${hours((Date.now() - pack.made_at) / 60000)} ago`;

function readiness(pack, lacks) {
  if (!pack) return "";
  if (!lacks.length) return `Ready for the river: ${age(pack)}.`;
  return lacks.includes("HTTPS") ? `The on-site check is on this phone: ${age(pack)}.` : "";
}

async function show() {
  const [pack, lacks] = [await get("packs", survey), await missing(survey)];
  const http = lacks.includes("HTTPS");
  section.hidden = false;
  part("no-https").hidden = !http;
  say("trouble", pack && lacks.length && !http ? `Not ready: ${lacks.join(" and ")} missing on this phone.` : "");
  say("good", readiness(pack, lacks));
  const newer = pack && !fromPhone && pack.plan !== Number(plan);
  say("news", newer ? `The plan is at version ${plan} now: make this phone ready again.` : "");
}

async function makeReady() {
  say("trouble", "");
  say("busy", "Fetching the field pack…");
  try {
    await fetchPack(address, (done, of) => say("busy", `Fetching page ${done} of ${of}…`));
    say("busy", "");
  } catch (trouble) {
    say("busy", `Not ready: ${trouble.message}. Try again with better signal.`);
  }
  await show();
}

// A sheet from the phone knows nothing of what was read since.
async function markStations() {
  const unsent = (await records()).filter((one) => one.survey === survey && one.state !== "sent");
  for (const old of document.querySelectorAll("[data-waits-here]")) old.remove();
  for (const code of new Set(unsent.map((one) => one.code))) {
    const line = document.createElement("p");
    line.dataset.waitsHere = "";
    line.textContent = `${counted(unsent.filter((one) => one.code === code))} on this phone, not sent yet`;
    document.getElementById(`station-${code}`)?.append(line);
  }
}

part("make").addEventListener("click", makeReady);
for (const event of ["bankside:waiting", "htmx:afterSettle"]) document.addEventListener(event, markStations);
show().then(markStations).catch((trouble) => {
  section.hidden = false;
  say("busy", `This phone keeps nothing: ${trouble.message}`);
});
