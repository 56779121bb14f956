// The reading form: where the phone is, and the point of the section that the link to the form names.
const GIVEN = ["position", "distance_left_m", "sensor_depth_m", "meter", "replicate"];
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

// The server fills in the point; a page that was kept on this phone knows nothing of it.
function takePoint() {
  const it = document.querySelector('form[data-kind="reading"]');
  if (!it || !("kept" in document.documentElement.dataset)) return;
  for (const [name, text] of new URLSearchParams(location.search)) {
    const field = GIVEN.includes(name) && it.elements[name];
    if (!field) continue;
    if (field.type === "checkbox") field.checked = true;
    else field.value = text;
    field.closest("details").open = true;
  }
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
takePoint();
