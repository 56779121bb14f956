// What waits as QR codes, one record each, and what another phone's camera found in one: both without signal.
import { records } from "./waiting_store.js";
import { asLetters, fromLetters, takeCopies } from "./copies.js";
import { isReading, placeOf, timeOf, valueOf } from "./kinds.js";
import { qrPicture } from "./qr_code.js";

// About as much as a camera still reads from the screen of a small phone.
const LONGEST = 1500;
const PREFIX = "#take=";
const main = document.querySelector("main");
const part = (name) => main.querySelector(`[data-${name}]`);
const unsent = async () => (await records()).filter((one) => one.state !== "sent");
let shown = [];
let at = 0;
let found;

function titleOf(record) {
  const which = isReading(record) ? `reading of ${record.authorName} at ${record.code}` : `${placeOf(record)}, of ${record.authorName}`;
  return `${which}, time ${timeOf(record)}`;
}

function showCode() {
  const record = shown[at];
  const title = titleOf(record);
  const address = `${location.origin}/phone${PREFIX}${asLetters(record)}`;
  const fits = address.length <= LONGEST;
  part("code-title").textContent = `${at + 1} of ${shown.length}: ${title}, ${record.surveyName}`;
  part("code-too-long").hidden = fits;
  part("code").replaceChildren(...(fits ? [qrPicture(address, `QR code of the ${title}`)] : []));
  part("code-turn").hidden = shown.length < 2;
}

async function showCodes() {
  shown = await unsent();
  if (!shown.length) return;
  at = 0;
  part("codes").hidden = false;
  showCode();
  part("codes").scrollIntoView();
}

function turn(by) {
  at = (at + by + shown.length) % shown.length;
  showCode();
}

async function offerCodes() {
  const waits = (await unsent()).length > 0;
  part("show-codes").hidden = !waits;
  if (!waits) part("codes").hidden = true;
}

function offerTaking() {
  if (!location.hash.startsWith(PREFIX)) return;
  found = fromLetters(location.hash.slice(PREFIX.length));
  part("taking").hidden = false;
  part("take-code").hidden = !found;
  const value = found && valueOf(found);
  part("taking-says").textContent = found
    ? `${isReading(found) ? "A " : ""}${titleOf(found)}${value ? `: ${value}` : ""}, ${found.surveyName}.`
    : "There is nothing whole in this code. Show it on the other phone and scan it again, or take its file.";
}

async function takeCode() {
  part("take-code").hidden = true;
  // Opened again from the history it would ask again.
  history.replaceState(history.state, "", location.pathname);
  await takeCopies([found], (words) => { part("taking-says").textContent = words; });
}

part("show-codes").addEventListener("click", showCodes);
part("code-before").addEventListener("click", () => turn(-1));
part("code-next").addEventListener("click", () => turn(1));
part("take-code").addEventListener("click", () => takeCode().catch(({ message }) => {
  part("taking-says").textContent = `This phone did not keep it: ${message}.`;
  part("take-code").hidden = false;
}));
document.addEventListener("bankside:waiting", offerCodes);
window.addEventListener("hashchange", offerTaking);
offerTaking();
offerCodes();
