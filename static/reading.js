// The reading form: where the phone is.
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

document.addEventListener("click", (event) => {
  const button = event.target.closest("[data-position-button]");
  if (button) notePosition(button);
});
document.addEventListener("htmx:afterSettle", showButtons);
document.addEventListener("htmx:historyRestore", showButtons);
showButtons();
