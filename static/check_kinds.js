// The phone's own check by kind: a reading, a meter against the field pack's saturation, wading against its limits.
import { checkOnPhone, number, pressureOf, saturation } from "./check.js";
import { facts, sentence } from "./check_words.js";
import { kindOf } from "./kinds.js";

const signed = (value, digits) => `${value < 0 ? "\u2212" : "+"}${Math.abs(value).toFixed(digits)}`;

// What a meter should read in a standard: looked up where it is made with air, 0 in zero solution, else as compared.
function expectedOf(pack, { kind, standard, ...fields }, units) {
  if (kind === "zero" || standard === "zero_solution") return 0;
  if (!["air_saturated_water", "water_saturated_air"].includes(standard)) return number(fields.compared);
  const typed = standard === "air_saturated_water" && fields.conductance_us_cm;
  const conductance = typed ? number(fields.conductance_us_cm, units.conductance_us_cm) : undefined;
  return saturation(pack, number(fields.water_temp_c, units.water_temp_c), pressureOf(pack, fields), conductance);
}

function meterCheck(pack, { fields }) {
  const units = pack.typed[fields.units] ?? pack.typed.si;
  const shown = number(fields.value);
  const expected = expectedOf(pack, fields, units);
  if (!Number.isFinite(shown) || !Number.isFinite(expected)) return null;
  const digits = fields.parameter === "conductance" ? 0 : 2;
  const unit = { conductance: " µS/cm", ph: "", temperature: fields.units === "us" ? " °F" : " °C" }[fields.parameter] ?? " mg/L";
  return {
    expected,
    sentence: `${signed(shown - expected, digits)}${unit} from what it should show. The server says whether that passes.`,
    lines: [["It shows", `${shown.toFixed(digits)}${unit}`], ["It should show", `${expected.toFixed(digits)}${unit}`]],
  };
}

const LOCAL = "Local rules and your employer's plan come first.";

// Never that anything is safe: below every limit there is nothing to say but whose judgement it is.
export function wading({ stop, caution, depth, ft2 }, metres, speed) {
  if (!Number.isFinite(metres)) return null;
  const product = metres * Math.abs(speed);
  const measured = `Depth times velocity is ${product.toFixed(2)} m²/s (${(product * ft2).toFixed(1)} ft²/s).`;
  if (product >= stop - 1e-9) {
    const limit = `The limit is ${stop.toFixed(2)} m²/s (${(stop * ft2).toFixed(0)} ft²/s).`;
    return { warns: true, sentence: `Do not wade. ${measured} ${limit} Use a bridge, a boat or the bank. ${LOCAL}` };
  }
  if (product >= caution - 1e-9) {
    return { warns: true, sentence: `${measured} The project's wading limit is ${caution} m²/s (${(caution * ft2).toFixed(1)} ft²/s). ${LOCAL}` };
  }
  if (metres > depth + 1e-9) return { warns: true, sentence: `The depth is above the project's wading limit of ${depth} m. ${LOCAL}` };
  return Number.isFinite(product) ? { warns: false, sentence: `${measured} Still your judgement: bed, cold, debris, experience.` } : null;
}

export function wadingOf(pack, fields) {
  const units = pack.typed[fields.units] ?? pack.typed.si;
  const [depth, speed] = ["wading_depth_m", "wading_velocity_m_s"].map((name) => number(fields[name], units[name]));
  return pack.wading ? wading(pack.wading, depth, speed) : null;
}

// The phone's own check of a record, as what it says and the lines below that; null where it has none.
export function checkOf(pack, record) {
  const kind = kindOf(record);
  if (kind === "check") return meterCheck(pack, record);
  if (kind === "reading") {
    const check = checkOnPhone(pack, record);
    return check && { ...check, number: check.oxygen.toFixed(2), sentence: sentence(check), lines: facts(check) };
  }
  const found = kind === "visit" && wadingOf(pack, record.fields);
  return found ? { ...found, lines: [] } : null;
}
