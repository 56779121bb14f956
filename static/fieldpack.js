// The field pack of a survey: fetched with the pages and files it needs, and checked to be all here.
import { all, get, put } from "./waiting_store.js";
import { ask, plural } from "./phone.js";

const PAGES = "bankside-pages";
const AT_ONCE = 4;

// What a day without signal would miss, in words; nothing when all is here.
export async function missing(survey) {
  if (!("serviceWorker" in navigator)) return ["HTTPS"];
  const pack = await get("packs", survey);
  if (!pack) return ["the field pack"];
  const [pages, worker] = await Promise.all([caches.open(PAGES), navigator.serviceWorker.getRegistration()]);
  const here = (list, cache) => Promise.all(list.map((one) => cache.match(one, { ignoreVary: true })));
  const [kept, files] = await Promise.all([here(pack.pages, pages), here(pack.files, caches)]);
  const lacking = (list) => list.filter((one) => !one).length;
  return [
    !worker?.active && "what opens pages without signal",
    lacking(kept) && plural(lacking(kept), "page", "pages"),
    lacking(files) && plural(lacking(files), "file", "files"),
  ].filter(Boolean);
}

async function storageWorks() {
  await put("facts", { key: "storage test", at: Date.now() });
  return Boolean((await get("facts", "storage test"))?.at);
}

async function fetchPages(pack, tell) {
  const cache = await caches.open(PAGES);
  const keep = async (address) => {
    const reply = await fetch(address, { cache: "no-store" });
    if (reply.status !== 200 || reply.redirected) throw new Error("a page did not come");
    await cache.put(address, reply);
  };
  for (let at = 0; at < pack.pages.length; at += AT_ONCE) {
    tell(at + 1, pack.pages.length);
    await Promise.all(pack.pages.slice(at, at + AT_ONCE).map(keep));
  }
  const wanted = new Set([...(await all("packs")).flatMap((one) => one.files), ...pack.files]);
  const files = await caches.open("bankside-files");
  await files.addAll(pack.files);
  for (const one of await files.keys()) {
    const { pathname, search } = new URL(one.url);
    if (!wanted.has(pathname + search)) await files.delete(one);
  }
}

// A new version waits for its place until nothing half typed could be touched by it.
async function letNewVersionIn(worker) {
  if (worker.waiting && !(await all("drafts")).length) worker.waiting.postMessage("take over");
}

export async function fetchPack(address, tell) {
  if (!(await storageWorks())) throw new Error("this phone keeps nothing");
  await navigator.storage?.persist?.();
  const answer = await ask(address, {}, 60);
  if (answer?.reply.status !== 200 || answer.reply.redirected) throw new Error("the field pack did not come");
  const pack = JSON.parse(answer.html);
  if ("serviceWorker" in navigator) {
    await letNewVersionIn(await navigator.serviceWorker.register("/worker.js"));
    await navigator.serviceWorker.ready;
    await fetchPages(pack, tell);
  }
  await put("packs", pack);
}
