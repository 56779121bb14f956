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

// The field sheet renews its stations by itself: the card under the reader's eyes stays where it was.
let kept = null;
document.addEventListener("htmx:beforeSwap", (event) => {
  if (event.target.id !== "day" || !event.detail.shouldSwap) return;
  const card = [...event.target.querySelectorAll("li[id]")].find((one) => one.getBoundingClientRect().bottom > 0);
  const top = card?.getBoundingClientRect().top;
  kept = top < window.innerHeight / 2 ? { id: card.id, top } : null;
});
document.addEventListener("htmx:afterSettle", () => {
  if (kept) window.scrollBy(0, (document.getElementById(kept.id)?.getBoundingClientRect().top ?? kept.top) - kept.top);
  kept = null;
});
