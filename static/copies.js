// Copies of what waits, in a file or in a code: the same records, under the same ids, so nothing doubles.
import { takeOver } from "./waiting_store.js";
import { addressOf, counted, fitsKind, timeOf } from "./kinds.js";
import { send } from "./sending.js";

const KIND = "waiting readings";

export function asFile(records) {
  return JSON.stringify({ bankside: KIND, v: 1, saved_at: new Date().toISOString(), records }, null, 1);
}

export function isRecord(one) {
  const texts = ["id", "survey", "code", "author", "authorName", "surveyName", "state"];
  const typed = one?.fields && Object.values(one.fields).every((text) => typeof text === "string");
  return typed && texts.every((name) => typeof one[name] === "string") && Number.isFinite(one.keptAt)
    && one.fields.submission_id === one.id && fitsKind(one);
}

// The records of a file's text, or null.
export function fromFile(text) {
  try {
    const copies = JSON.parse(text);
    return copies?.bankside === KIND && Array.isArray(copies.records) && copies.records.every(isRecord) ? copies.records : null;
  } catch {
    return null;
  }
}

// What was left empty need not be carried, except to a visit that goes on: there it may take something back.
const written = (fields) => Object.fromEntries(Object.entries(fields).filter(([, text]) => text !== ""));

// A record as letters that an address takes. What follows from the rest is left out: a smaller code is read more easily.
export function asLetters(record) {
  const { id, url, tries, nextAt, check, fields, ...rest } = record;
  const kept = { ...rest, fields: fields.visit_id ? fields : written(fields) };
  if (url !== addressOf(record)) kept.url = url;
  const bytes = new TextEncoder().encode(JSON.stringify(kept));
  return btoa(String.fromCharCode(...bytes)).replace(/\+/g, "-").replace(/\//g, "_").replace(/=+$/, "");
}

// The record of a code's letters, or null.
export function fromLetters(letters) {
  try {
    const bytes = Uint8Array.from(atob(letters.replace(/-/g, "+").replace(/_/g, "/")), (letter) => letter.charCodeAt(0));
    const kept = JSON.parse(new TextDecoder("utf-8", { fatal: true }).decode(bytes));
    const record = { url: addressOf(kept), ...kept, id: kept.fields.submission_id, tries: 0 };
    const waits = record.v === 1 && ["waiting", "refused"].includes(record.state) && Boolean(timeOf(record));
    return waits && isRecord(record) ? record : null;
  } catch {
    return null;
  }
}

// Into this phone's own list, and off to the server from here, if it answers.
export async function takeCopies(records, say) {
  const added = await takeOver(records.map((one) => ({ ...one, nextAt: 0 })));
  say(`${counted(added) || "Nothing"} taken over, ${records.length - added.length} here already.`);
  return send();
}
