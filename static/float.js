// A float's run against the clock: start, stop, and the seconds of each run stand in the form's own field.
import { number } from "./check.js";

let started;
let timer;

const parts = (section) => {
  const at = (name) => section.querySelector(`[data-${name}]`);
  return { at, times: section.querySelector("[name=float_times]"), distance: section.querySelector("[name=float_distance]") };
};
const runs = (times) => times.value.trim().split(/[\s;/]+/).filter(Boolean);
const seconds = () => (performance.now() - started) / 1000;

function say(section) {
  const { at, times, distance } = parts(section);
  const known = runs(times).map((text) => number(text));
  const run = number(distance.value);
  const unit = distance.parentElement.querySelector(".unit").textContent;
  at("take-back").hidden = !known.length;
  if (!known.length || !known.every((one) => one > 0) || !(run > 0)) {
    at("float-says").textContent = "";
    return;
  }
  const surface = run / (known.reduce((sum, one) => sum + one) / known.length);
  const of = known.length > 1 ? `, mean of ${known.length} runs` : "";
  at("float-says").textContent = `${surface.toFixed(2)} ${unit}/s at the surface${of}; 0.85 of it, ${(0.85 * surface).toFixed(2)} ${unit}/s, is the mean.`;
}

function changeTimes(times, texts) {
  times.value = texts.join(" ");
  times.dispatchEvent(new Event("input", { bubbles: true }));
}

function start(section) {
  const { at } = parts(section);
  started = performance.now();
  clearInterval(timer);
  timer = setInterval(() => { at("seconds").textContent = seconds().toFixed(1); }, 100);
  at("start").disabled = true;
  at("stop").disabled = false;
}

function stop(section) {
  const { at, times } = parts(section);
  const ran = seconds().toFixed(1);
  clearInterval(timer);
  at("seconds").textContent = ran;
  at("start").disabled = false;
  at("stop").disabled = true;
  changeTimes(times, [...runs(times), ran]);
}

function show() {
  for (const section of document.querySelectorAll("[data-float]")) {
    parts(section).at("timer").hidden = false;
    say(section);
  }
}

document.addEventListener("click", ({ target }) => {
  const section = target.closest("[data-float]");
  if (!section) return;
  const { times } = parts(section);
  if (target.closest("[data-start]")) start(section);
  if (target.closest("[data-stop]")) stop(section);
  if (target.closest("[data-take-back]")) changeTimes(times, runs(times).slice(0, -1));
});
document.addEventListener("input", ({ target }) => {
  const section = target.closest("[data-float]");
  if (section) say(section);
});
for (const event of ["htmx:afterSettle", "bankside:again"]) document.addEventListener(event, show);
show();
