// The on-site check without signal: values are looked up in the field pack's tables, a straight line between entries.
// Outside a table there is no answer, as on the server.
function place(xs, x) {
  if (!(x >= xs[0] && x <= xs[xs.length - 1])) return null;
  let low = 0;
  let high = xs.length - 1;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (xs[middle] <= x) low = middle;
    else high = middle;
  }
  return { at: low, share: (x - xs[low]) / (xs[low + 1] - xs[low]) };
}

const mix = (one, other, share) => one + (other - one) * share;

export function along(xs, ys, x) {
  const here = place(xs, x);
  return here ? mix(ys[here.at], ys[here.at + 1], here.share) : undefined;
}

function across({ x, y, z }, a, b) {
  const row = place(x, a);
  const column = place(y, b);
  if (!row || !column) return undefined;
  const [upper, lower] = [z[row.at], z[row.at + 1]].map((line) => mix(line[column.at], line[column.at + 1], column.share));
  return mix(upper, lower, row.share);
}

export function saturation(pack, celsius, mmhg, conductance) {
  const salinity = conductance === undefined ? 0 : along(pack.salinity.x, pack.salinity.y, conductance);
  const found = across(pack.saturation, celsius, mmhg) * across(pack.salted, celsius, salinity);
  return Number.isFinite(found) ? found : undefined;
}

// A number as the server reads it; one that could be read in two ways, or is none, gives no check here.
export function number(text, { scale, shift } = { scale: 1, shift: 0 }) {
  const plain = (text ?? "").replace(/[\u2212\u2013]/g, "-").trim();
  if (!/^[+-]?(\d+([.,]\d*)?|[.,]\d+)$/.test(plain) || /^[+-]?[1-9]\d{0,2},\d{3}$/.test(plain)) return undefined;
  return Number(plain.replace(",", ".")) * scale + shift;
}

export function pressureOf(pack, fields) {
  const typed = number(fields.pressure, pack.typed.si[fields.pressure_unit]);
  if (typed === undefined) return pack.standard;
  return fields.pressure_source === "weather" ? (along(pack.weather.x, pack.weather.y, typed) ?? typed) : typed;
}

// What the sag of the pack has at a station: the oxygen there at the measured temperature, with its band.
function expected(sag, km, full) {
  const at = (name) => along(sag.km, sag[name], km);
  const deficit = at("deficit");
  if (deficit === undefined || full === undefined) return {};
  const shift = full - deficit - at("do");
  const [predicted, low, high] = ["do", "low", "high"].map((name) => Math.max(0, at(name) + shift));
  return { predicted, low, high, travel: km >= 0 ? at("travel_h") : undefined };
}

// Without a colon and a zone, so that both are read alike: only their difference counts.
const minutesBetween = (one, other) => (Date.parse(`${other}Z`) - Date.parse(`${one}Z`)) / 60000;

// Of several values the median of the last ones is the oxygen; one in the box that is none of them is the last.
function oxygenOf(pack, fields) {
  const typed = number(fields.do_mg_l);
  const words = (fields.values ?? "").split(/[\s;]+/).filter(Boolean);
  const values = words.map((one) => number(one.replace(/,$/, "").split(/[@/]/)[0]));
  if (!values.length || values.includes(undefined)) return typed;
  if (typed !== undefined && !values.includes(typed)) values.push(typed);
  const last = values.slice(-(pack.stable_values ?? 5)).sort((one, other) => one - other);
  const middle = last.length >> 1;
  return last.length % 2 ? last[middle] : (last[middle - 1] + last[middle]) / 2;
}

export function checkOnPhone(pack, { code, fields }) {
  const units = pack.typed[fields.units] ?? pack.typed.si;
  const celsius = number(fields.water_temp_c, units.water_temp_c);
  const conductance = fields.conductance_us_cm ? number(fields.conductance_us_cm, units.conductance_us_cm) : undefined;
  const mmhg = pressureOf(pack, fields);
  const full = saturation(pack, celsius, mmhg, conductance);
  const percentOf = fields.percent_basis === "760" ? saturation(pack, celsius, 760, conductance) : full;
  const oxygen = oxygenOf(pack, fields) ?? (number(fields.do_percent) / 100) * percentOf;
  if (!Number.isFinite(oxygen)) return null;
  const station = pack.stations.find((one) => one.code === code);
  const plan = pack.sag && station ? expected(pack.sag, station.km, full) : {};
  const late = pack.release_at && plan.travel !== undefined
    ? minutesBetween(pack.release_at, fields.taken_at) - plan.travel * 60 : undefined;
  const today = pack.today && station ? along(pack.today.km, pack.today.do, station.km) : undefined;
  return {
    oxygen, saturation: full, deficit: full === undefined ? undefined : full - oxygen, ...plan, late, today,
    allowed: Math.max(pack.parcel_h, pack.parcel_share * (plan.travel ?? 0)) * 60,
  };
}
