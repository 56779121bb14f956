// Pages and packs on this phone are one person's: another signs in, or somebody signs out, and they go. What waits stays.
import { get, inStore, put } from "./waiting_store.js";
import { person } from "./phone.js";

async function clear() {
  if ("caches" in window) await caches.delete("bankside-pages");
  await inStore("packs", "readwrite", (store) => store.clear());
}

export async function settlePerson() {
  if ("kept" in document.documentElement.dataset) return;
  const last = await get("facts", "person");
  if (last?.id === person) return;
  if (last) await clear();
  await put("facts", { key: "person", id: person });
}

document.addEventListener("submit", async (event) => {
  if (!event.target.matches('form[action$="/sign-out"]')) return;
  event.preventDefault();
  await clear().catch(() => {});
  event.target.submit();
});
