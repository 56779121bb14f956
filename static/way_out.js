// A copy of what waits, as a file; taking one over; and whether this phone keeps what is written on it.
import { get, put, records } from "./waiting_store.js";
import { asFile, fromFile, takeCopies } from "./copies.js";
import { counted } from "./kinds.js";

const LOW_BYTES = 50e6;
const main = document.querySelector("main");
const part = (name) => main.querySelector(`[data-${name}]`);
const say = (words) => { part("copy-says").textContent = words; };

async function saveCopy() {
  const waiting = (await records()).filter((one) => one.state !== "sent");
  const link = document.createElement("a");
  link.href = URL.createObjectURL(new Blob([asFile(waiting)], { type: "application/json" }));
  link.download = `bankside-waiting-${new Date().toISOString().slice(0, 16).replace(/[-:]/g, "")}.json`;
  link.click();
  setTimeout(() => URL.revokeObjectURL(link.href), 60000);
  say(`${counted(waiting)} written to the file ${link.download}. They also still wait here.`);
}

async function takeCopy() {
  const [file] = part("copy-form").elements.file.files;
  if (!file) return say("Choose the file first.");
  const copies = fromFile(await file.text().catch(() => ""));
  if (!copies) return say("This is no file that a phone saved, or it was changed since.");
  return takeCopies(copies, say);
}

async function storage() {
  await put("facts", { key: "storage test", at: Date.now() });
  const works = (await get("facts", "storage test"))?.at;
  part("storage-test").textContent = works
    ? "Writing and reading back works." : "This phone does not read back what it wrote: do not record on it.";
  const kept = await navigator.storage?.persisted?.();
  part("storage-kept").textContent = kept
    ? "This phone promises not to delete it by itself."
    : "This phone makes no promise to keep it: send when there is signal, and let nothing wait for days.";
  part("persist").hidden = Boolean(kept) || !navigator.storage?.persist;
  const { quota, usage } = (await navigator.storage?.estimate?.()) ?? {};
  const room = quota - usage;
  if (Number.isFinite(room)) {
    const low = room < LOW_BYTES ? " That is little: free some room before the day." : "";
    part("storage-room").textContent = `About ${Math.round(room / 1e6)} MB of room left.${low}`;
  }
}

async function persist() {
  const granted = await navigator.storage.persist();
  await storage();
  if (!granted) part("storage-kept").textContent = "This phone did not agree to keep it. Adding Bankside to the home screen often helps.";
}

async function offerCopy() {
  part("save-copy").hidden = !(await records()).some((one) => one.state !== "sent");
}

async function showParts() {
  part("take-over").hidden = false;
  part("storage-part").hidden = false;
  await storage().catch(({ message }) => {
    part("storage-test").textContent = `This phone keeps nothing: ${message}. Do not record on it.`;
  });
  await offerCopy();
}

part("save-copy").addEventListener("click", saveCopy);
part("take-over").addEventListener("click", takeCopy);
part("persist").addEventListener("click", persist);
document.addEventListener("bankside:waiting", offerCopy);
showParts().catch(({ message }) => say(message));
