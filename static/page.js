// What HTML can't do by itself: put the reader where something changed or needs another look.
function toFirstError(root) {
  const wrong = root.querySelector('[aria-invalid="true"]');
  if (!wrong) return;
  const folded = wrong.closest("details:not([open])");
  if (folded) folded.open = true;
  wrong.focus();
}

toFirstError(document);
document.addEventListener("htmx:afterSettle", (event) => toFirstError(event.target));
