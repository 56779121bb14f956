// Who this phone works for, by the page it was given, and what time it is where the survey is.
export const phone = document.querySelector("#phone");
export const person = phone?.dataset.person;

export function newId() {
  if (crypto.randomUUID) return crypto.randomUUID();
  // A plain-HTTP hotspot has no randomUUID, but it has random numbers.
  const bytes = crypto.getRandomValues(new Uint8Array(16));
  bytes[6] = (bytes[6] & 0x0f) | 0x40;
  bytes[8] = (bytes[8] & 0x3f) | 0x80;
  const hex = Array.from(bytes, (byte) => byte.toString(16).padStart(2, "0")).join("");
  return hex.replace(/^(.{8})(.{4})(.{4})(.{4})(.{12})$/, "$1-$2-$3-$4-$5");
}

// The present moment as a datetime-local field takes it, in the survey's zone rather than this phone's.
export function nowIn(timeZone) {
  const parts = new Intl.DateTimeFormat("en-CA", {
    timeZone, year: "numeric", month: "2-digit", day: "2-digit", hour: "2-digit", minute: "2-digit", hourCycle: "h23",
  }).formatToParts(new Date());
  const { year, month, day, hour, minute } = Object.fromEntries(parts.map(({ type, value }) => [type, value]));
  return `${year}-${month}-${day}T${hour}:${minute}`;
}

export function clock(instant) {
  const date = new Date(instant);
  const time = date.toLocaleTimeString("en-GB", { hour: "2-digit", minute: "2-digit" });
  if (date.toDateString() === new Date().toDateString()) return time;
  return `${date.toLocaleDateString("en-GB", { day: "numeric", month: "short" })} ${time}`;
}

// "Tue 1 Dec 15:54" of what a datetime-local field holds, as the server writes it; another text as it is.
export function dayClock(text) {
  const date = new Date(`${text}Z`);
  if (Number.isNaN(date.getTime())) return text;
  const parts = new Intl.DateTimeFormat("en-US", {
    timeZone: "UTC", weekday: "short", day: "numeric", month: "short", hour: "2-digit", minute: "2-digit", hourCycle: "h23",
  }).formatToParts(date);
  const { weekday, day, month, hour, minute } = Object.fromEntries(parts.map(({ type, value }) => [type, value]));
  return `${weekday} ${day} ${month} ${hour}:${minute}`;
}

export function plural(count, one, many) {
  return `${count} ${count === 1 ? one : many}`;
}

// A fetch that gives up: without signal some phones would wait for minutes.
export async function ask(address, options = {}, seconds = 15) {
  const patience = new AbortController();
  const timer = setTimeout(() => patience.abort(), seconds * 1000);
  try {
    const reply = await fetch(address, { ...options, signal: patience.signal });
    return { reply, html: await reply.text() };
  } catch {
    return null;
  } finally {
    clearTimeout(timer);
  }
}

export const parsed = (html) => new DOMParser().parseFromString(html, "text/html");
