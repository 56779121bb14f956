// Keeps the pages and files that were chosen for this phone, for when no server answers. FILES is set by the server.
const PAGES = "bankside-pages";
const KEPT_FILES = "bankside-files";
const PATIENCE_MS = 4000;
const anyHeaders = { ignoreVary: true };

self.addEventListener("install", (event) => {
  event.waitUntil(caches.open(KEPT_FILES).then((cache) => cache.addAll(FILES)));
});
self.addEventListener("activate", (event) => event.waitUntil(self.clients.claim()));

self.addEventListener("message", ({ data }) => { if (data === "take over") self.skipWaiting(); });

self.addEventListener("fetch", (event) => {
  const { request } = event;
  const url = new URL(request.url);
  if (request.method !== "GET" || url.origin !== location.origin) return;
  if (request.mode === "navigate") event.respondWith(page(event, url.pathname));
  else if (/^\/(scripts|static)\/|^\/htmx\.js$/.test(url.pathname)) event.respondWith(file(request));
});

// Addresses of files carry a mark of their content, so what is kept is never old.
async function file(request) {
  return (await caches.match(request, anyHeaders)) ?? fetch(request);
}

function inTime(answer, ms) {
  return Promise.race([answer, new Promise((_, reject) => setTimeout(reject, ms, new Error("no answer in time")))]);
}

// The server's page when it comes soon enough, else the one on the phone.
async function page(event, path) {
  const cache = await caches.open(PAGES);
  const kept = await cache.match(path, anyHeaders);
  const answer = fetch(event.request);
  try {
    const reply = await (kept ? inTime(answer, PATIENCE_MS) : answer);
    if (kept && reply.status >= 500) return marked(kept);
    // A form that its link filled in ("?position=left") is not the page to keep.
    const plain = !new URL(event.request.url).search;
    if (kept && plain && reply.status === 200 && !reply.redirected) event.waitUntil(renew(cache, path, reply.clone()));
    return reply;
  } catch (trouble) {
    // The list of meters needs signal; the form to check one is on the phone.
    const check = path.endsWith("/meters") && (await cache.match(`${path}/check`, anyHeaders));
    const instead = kept ?? (check || (await cache.match("/phone", anyHeaders)));
    if (instead) return marked(instead);
    throw trouble;
  }
}

// A newer page takes the older one's place only once every file that it wants is here too.
async function renew(cache, path, reply) {
  const wanted = (await reply.clone().text()).matchAll(/(?:src|href)="(\/(?:scripts|static)\/[^"]+|\/htmx\.js[^"]*)"/g);
  const here = await Promise.all([...wanted].map(([, address]) => caches.match(address, anyHeaders)));
  if (here.every(Boolean)) await cache.put(path, reply);
}

// The page says when it was fetched, and its script knows that no server gave it just now.
async function marked(kept) {
  const html = await kept.text();
  const headers = new Headers(kept.headers);
  headers.delete("Content-Encoding");
  headers.delete("Content-Length");
  const at = Date.parse(headers.get("Date")) || 0;
  return new Response(html.replace("<html ", `<html data-kept="${at}" `), { headers });
}
