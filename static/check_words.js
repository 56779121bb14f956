// The phone's check in words, and where the server's own check, which comes later, differs from it.
import { clock } from "./phone.js";

const ROUNDING_MG_L = 0.011;
const mg = (value, digits = 2) => value.toFixed(digits);

export function hours(minutes) {
  const whole = Math.round(Math.abs(minutes));
  if (whole < 60) return `${whole} min`;
  return `${Math.floor(whole / 60)} h ${String(whole % 60).padStart(2, "0")} min`;
}

// Within this a reading is as predicted, for the server too.
const NEAR_MG_L = 0.3;

export function sentence({ oxygen, predicted, low, high }) {
  if (predicted === undefined) return "Nothing to compare with on this phone.";
  const apart = Math.abs(oxygen - predicted);
  const band = `${mg(low, 1)} to ${mg(high, 1)}`;
  if (apart <= NEAR_MG_L) return `As predicted: the plan has ${mg(predicted, 1)} mg/L (${band}) here.`;
  const says = `${mg(apart, 1)} mg/L ${oxygen < predicted ? "lower" : "higher"} than predicted`;
  if (oxygen < low || oxygen > high) return `${says}: the plan has ${band} mg/L here.`;
  return `${says}. The plan's own doubts allow it: ${band} mg/L.`;
}

export function facts(check) {
  const said = [];
  if (check.saturation !== undefined) {
    said.push(["Saturation", `${Math.round((100 * check.oxygen) / check.saturation)} % of ${mg(check.saturation)} mg/L`]);
    said.push(["Deficit", `${mg(check.deficit)} mg/L`]);
  } else said.push(["Saturation", "can't be told from what was typed"]);
  if (check.predicted !== undefined) {
    said.push(["Predicted", `${mg(check.predicted, 1)} mg/L (${mg(check.low, 1)} to ${mg(check.high, 1)}) at this temperature`]);
  }
  if (check.today !== undefined) said.push(["Today's sag", `${mg(check.today, 1)} mg/L here, when the pack was made`]);
  if (check.travel !== undefined) said.push(["Travel time", `${hours(check.travel * 60)} below the outfall`]);
  if (check.late !== undefined) {
    const how = Math.abs(check.late) <= check.allowed ? ", near enough" : ", not the parcel that was released";
    said.push(["Parcel", `${hours(check.late)} ${check.late > 0 ? "late" : "early"}${how}`]);
  }
  return said;
}

export function age(pack) {
  return `Worked out on this phone from the field pack of ${clock(pack.made_at)}, plan version ${pack.plan}.`;
}

const COMPARED = { saturation: "saturation", deficit: "deficit", predicted: "prediction" };

// What the server says otherwise, beyond rounding, in words; nothing where the two agree.
export function differences(check, server = {}) {
  return Object.entries(COMPARED).flatMap(([name, word]) => {
    const theirs = server[name] ? Number(server[name]) : undefined;
    const ours = check[name];
    if (theirs === undefined || ours === undefined || Math.abs(theirs - ours) <= ROUNDING_MG_L) return [];
    return [`${word} ${mg(theirs)} mg/L, on the phone it was ${mg(ours)}`];
  }).join("; ");
}
