// What this phone keeps: one database, read and written one transaction at a time, on the disk before it says so.
const STORES = { waiting: "id", drafts: "key", packs: "survey", facts: "key" };
let opened;

function open() {
  opened ??= new Promise((resolve, reject) => {
    const asked = indexedDB.open("bankside", 1);
    asked.onupgradeneeded = () => {
      for (const [name, keyPath] of Object.entries(STORES)) asked.result.createObjectStore(name, { keyPath });
    };
    asked.onsuccess = () => {
      // Another tab with a newer version must not wait for this one.
      asked.result.onversionchange = () => { asked.result.close(); opened = undefined; };
      asked.result.onclose = () => { opened = undefined; };
      resolve(asked.result);
    };
    asked.onerror = () => { opened = undefined; reject(asked.error); };
  });
  return opened;
}

export async function inStore(names, mode, work) {
  const db = await open();
  return new Promise((resolve, reject) => {
    const deal = db.transaction(names, mode, { durability: "strict" });
    const asked = work(...[names].flat().map((name) => deal.objectStore(name)));
    deal.oncomplete = () => resolve(asked instanceof IDBRequest ? asked.result : asked);
    deal.onabort = () => reject(deal.error ?? new Error("this phone did not keep it"));
  });
}

export const get = (name, key) => inStore(name, "readonly", (store) => store.get(key));
export const all = (name) => inStore(name, "readonly", (store) => store.getAll());
export const put = (name, value) => inStore(name, "readwrite", (store) => store.put(value));
export const remove = (name, key) => inStore(name, "readwrite", (store) => store.delete(key));

const channel = "BroadcastChannel" in window ? new BroadcastChannel("bankside") : undefined;
const heard = () => document.dispatchEvent(new Event("bankside:waiting"));
channel?.addEventListener("message", heard);

export function changed() {
  heard();
  channel?.postMessage("waiting");
}

// Ids say nothing about time: what was kept first is shown and sent first.
export async function records() {
  return (await all("waiting")).sort((one, other) => one.keptAt - other.keptAt);
}

// What is saved takes the place of what was being typed, in one transaction: never neither, never both.
export async function keepRecord(record, draftKey) {
  await inStore(["waiting", "drafts"], "readwrite", (waiting, drafts) => {
    waiting.put(record);
    drafts.delete(draftKey);
  });
  changed();
}

// Change a record unless it was saved anew since: an answer to the older text says nothing about the newer.
export async function changeRecord({ id, keptAt }, changes) {
  await inStore("waiting", "readwrite", (store) => {
    store.get(id).onsuccess = ({ target: { result } }) => {
      if (result && result.keptAt === keptAt) store.put({ ...result, ...changes });
    };
  });
  changed();
}

// Take over the records of a copy and return those; one that is here already stays as it is.
export async function takeOver(copies) {
  const added = [];
  await inStore("waiting", "readwrite", (store) => {
    for (const copy of copies) {
      store.get(copy.id).onsuccess = ({ target: { result } }) => {
        if (result) return;
        store.put(copy);
        added.push(copy);
      };
    }
  });
  changed();
  return added;
}

const MONTH_MS = 30 * 24 * 3600 * 1000;

// What was sent stays to be looked at for a month.
export async function forgetOld() {
  for (const record of await records()) {
    if (record.state === "sent" && Date.now() - record.sentAt > MONTH_MS) await remove("waiting", record.id);
  }
}
