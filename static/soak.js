// A timed reading: seconds since the probe went in, and the values that the meter showed meanwhile, each with its
// seconds and the temperature then. They stand as text in the form, so that all of them can be seen and corrected.
const SECOND = 1000;
let ticking;

const timer = () => document.querySelector("[data-soak]");
const began = (it) => Number(it.form.elements.soak_began.value);
const secondsOf = (it) => Math.round((Date.now() - began(it)) / SECOND);
const changed = (field) => field.dispatchEvent(new Event("input", { bubbles: true }));

function parts() {
  const box = timer();
  return box && { box, form: box.closest("form"), says: box.querySelector("[data-soak-says]") };
}

// What was typed may come back to the form at any time: every second looks whether a probe is in.
function tick() {
  const it = parts();
  if (!it || !began(it)) return;
  it.box.querySelector("[data-soak-seconds]").textContent = `${secondsOf(it)} s since the probe went in`;
}

// The screen stays lit while the probe soaks, where the phone allows it; leaving the page lets it go dark.
function start(it) {
  it.form.elements.soak_began.value = Date.now();
  changed(it.form.elements.soak_began);
  navigator.wakeLock?.request("screen").catch(() => {});
  tick();
  it.form.elements.do_mg_l.focus();
}

// What stands in the boxes now becomes one more value; the oxygen box is free for the next.
function take(it) {
  const { do_mg_l: oxygen, water_temp_c: temperature, values, soak_s: soaked } = it.form.elements;
  const value = oxygen.value.trim();
  const says = (words) => { it.says.textContent = words; };
  if (!/^[-+]?\d*[.,]?\d+$/.test(value)) {
    says("Enter the oxygen that the meter shows, then take it.");
    return oxygen.focus();
  }
  const warmth = temperature.value.trim();
  const when = began(it) ? `@${secondsOf(it)}` : "";
  const warm = when && warmth && !/[\s;/@]/.test(warmth) ? `/${warmth}` : "";
  values.value = [values.value.trim(), `${value}${when}${warm}`].filter(Boolean).join("\n");
  if (when) soaked.value = secondsOf(it);
  oxygen.value = "";
  changed(values);
  navigator.vibrate?.(40);
  const taken = values.value.split(/[\s;]+/).map((one) => one.split(/[@/]/)[0]);
  says(`${taken.length} ${taken.length === 1 ? "value" : "values"}: ${taken.join(" ")}`);
  return oxygen.focus();
}

function show() {
  const it = parts();
  if (!it) return;
  it.box.hidden = false;
  ticking ??= setInterval(tick, SECOND);
  tick();
}

document.addEventListener("click", ({ target }) => {
  const it = parts();
  if (it && target.closest("[data-soak-start]")) start(it);
  if (it && target.closest("[data-soak-take]")) take(it);
});
// While the clock runs, Enter on the phone's keyboard takes the value instead of saving the reading.
document.addEventListener("keydown", (event) => {
  const it = parts();
  if (!it || event.key !== "Enter" || event.target.name !== "do_mg_l" || !began(it) || !event.target.value) return;
  event.preventDefault();
  take(it);
});
document.addEventListener("htmx:afterSettle", show);
document.addEventListener("htmx:historyRestore", show);
show();
