// The reading form: an id made on this phone for each fresh form, where the phone is, and what to do without an answer.
function newId() {
  if (crypto.randomUUID) return crypto.randomUUID();
  // A plain-HTTP hotspot has no randomUUID, but it has random numbers.
  const bytes = crypto.getRandomValues(new Uint8Array(16));
  bytes[6] = (bytes[6] & 0x0f) | 0x40;
  bytes[8] = (bytes[8] & 0x3f) | 0x80;
  const hex = Array.from(bytes, (byte) => byte.toString(16).padStart(2, "0")).join("");
  return hex.replace(/^(.{8})(.{4})(.{4})(.{4})(.{12})$/, "$1-$2-$3-$4-$5");
}

// A page that comes from a cache carries the id of a reading that may be stored by now.
function freshId() {
  const form = document.querySelector("form[data-fresh]");
  if (!form) return;
  form.elements.submission_id.value = newId();
  form.removeAttribute("data-fresh");
}

const TROUBLES = {
  1: "This phone does not give its position to this page. Go on without it.",
  2: "This phone does not know where it is. Go on without it.",
  3: "No position within half a minute. Go on without it, or try again.",
};

function notePosition(button) {
  const { latitude, longitude, position_radius_m: radius } = button.form.elements;
  const status = button.closest("[data-position]").querySelector("[data-position-status]");
  status.textContent = "Looking for the position. You can go on meanwhile.";
  navigator.geolocation.getCurrentPosition(
    ({ coords }) => {
      latitude.value = coords.latitude.toFixed(6);
      longitude.value = coords.longitude.toFixed(6);
      radius.value = Math.ceil(coords.accuracy);
      const rough = coords.accuracy > 100 ? " That is rough: leave the note on where you are." : "";
      status.textContent = `Position noted, within ${radius.value} m.${rough}`;
    },
    (trouble) => { status.textContent = TROUBLES[trouble.code] ?? TROUBLES[2]; },
    { enableHighAccuracy: true, timeout: 30000, maximumAge: 10000 },
  );
}

function showButtons() {
  const here = window.isSecureContext && "geolocation" in navigator;
  for (const button of document.querySelectorAll("[data-position-button]")) button.hidden = !here;
}

const NO_ANSWER = "Not saved: the server did not answer. What you typed is still here; save again in a moment.";
const SIGNED_OUT = "Not saved: you are signed out. Sign in on another tab, come back, and save again; what you typed is still here.";
const REFUSED = "Not saved: the server could not take it. What you typed is still here; try again, and tell the office if it stays so.";

function tell(words) {
  const line = document.querySelector("[data-not-saved]");
  if (!line) return;
  line.textContent = words;
  line.hidden = false;
  line.scrollIntoView({ block: "center" });
}

// Signing in begins another session, and the form needs that session's token.
async function renewToken() {
  const line = document.querySelector("[data-not-saved]:not([hidden])");
  if (!line || document.visibilityState !== "visible") return;
  const reply = await fetch(location.href).catch(() => null);
  const page = new DOMParser().parseFromString(reply ? await reply.text() : "", "text/html");
  const token = page.querySelector("#reading [name=csrf_token]");
  if (token) line.closest("form").elements.csrf_token.value = token.value;
}

document.addEventListener("click", (event) => {
  const button = event.target.closest("[data-position-button]");
  if (button) notePosition(button);
});
document.addEventListener("htmx:sendError", () => tell(NO_ANSWER));
document.addEventListener("htmx:timeout", () => tell(NO_ANSWER));
// The server takes a form of an ended session for a forged one: 400.
document.addEventListener("htmx:responseError", (event) => tell(event.detail.xhr.status === 400 ? SIGNED_OUT : REFUSED));
document.addEventListener("htmx:beforeSwap", (event) => {
  if (!event.detail.xhr.responseURL.includes("/sign-in")) return;
  event.detail.shouldSwap = false;
  tell(SIGNED_OUT);
});
document.addEventListener("visibilitychange", renewToken);
document.addEventListener("htmx:afterSettle", showButtons);
document.addEventListener("htmx:historyRestore", () => { freshId(); showButtons(); });
freshId();
showButtons();
