// What a phone may keep, by kind: what it is called and where it is saved. A record without a kind, of an old page, is a reading.
import { dayClock, plural } from "./phone.js";

const station = (last) => ({ survey, code }) => `/surveys/${survey}/stations/${encodeURIComponent(code)}/${last}`;
const KINDS = {
  reading: { one: "reading", many: "readings", again: "Another reading here", address: station("reading") },
  visit: { one: "visit entry", many: "visit entries", again: "Go on with this visit", address: station("visit") },
  bottle: { one: "bottle", many: "bottles", again: "Another bottle here", address: station("bottle") },
  check: {
    one: "meter check", many: "meter checks", again: "Another check",
    address: ({ survey }) => `/surveys/${survey}/meters/check`,
  },
};
const SAVED_AT = /^\/surveys\/[^/]+\/(stations\/[^/]+\/(reading|visit|bottle)|meters\/(check))$/;

export const kindOf = (record) => (Object.hasOwn(KINDS, record.kind ?? "") ? record.kind : "reading");
export const wordsOf = (record) => KINDS[kindOf(record)];
export const isReading = (record) => kindOf(record) === "reading";
export const addressOf = (record) => wordsOf(record).address(record);
// The field of a form that says when it was.
export const timeFields = ["taken_at", "checked_at", "arrived_at", "collected_at"];

// Whether a record of this kind can have come from a form with this address.
export function fitsKind({ kind, url }) {
  const [, , atStation, ofMeter] = SAVED_AT.exec(url ?? "") ?? [];
  return (atStation ?? ofMeter) === (kind ?? "reading");
}

// "2 readings and 1 meter check".
export function counted(records) {
  const said = Object.entries(KINDS).flatMap(([kind, { one, many }]) => {
    const count = records.filter((record) => kindOf(record) === kind).length;
    return count ? [plural(count, one, many)] : [];
  });
  return said.length < 2 ? said.join("") : `${said.slice(0, -1).join(", ")} and ${said.at(-1)}`;
}

export function timeOf(record) {
  return dayClock(timeFields.map((name) => record.fields[name]).find(Boolean) ?? "");
}

// What it is and where: "D5" of a reading as ever, "Meter check, Meter A" as its form calls it.
export const placeOf = (record) => (isReading(record) ? record.code : record.what || `${wordsOf(record).one} ${record.code}`);

// What a form records, as the form calls it; the meter may have been chosen since the page was made.
export function whatOf({ dataset: { kind, what = "" }, elements }) {
  const chosen = kind === "check" && elements.meter?.selectedOptions?.[0];
  return chosen?.value ? `Meter check, ${chosen.text}` : what;
}

// What was read, in a few words; nothing for a kind that is no one number.
export function valueOf({ fields, ...record }) {
  if (isReading(record)) {
    const several = (fields.values ?? "").split(/[\s;]+/).map((one) => one.split(/[@/]/)[0]).filter(Boolean);
    if (several.length) return `${several.join(" ")} mg/L`;
    return fields.do_mg_l ? `${fields.do_mg_l} mg/L` : `${fields.do_percent} %`;
  }
  if (record.kind === "bottle") return fields.code;
  if (record.kind === "check") return fields.value ? `shows ${fields.value}` : "";
  return fields.left_at ? `left ${dayClock(fields.left_at)}` : "";
}
