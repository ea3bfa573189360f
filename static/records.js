// With a script the Save button of a card shows once something in the card was changed.
document.documentElement.classList.add("scripted");
document.addEventListener("change", (event) => {
  event.target.closest?.(".rcard")?.classList.add("dirty");
});

// A saved card is folded again, so the button that was pressed is gone: its "edit" takes the focus.
let saving = null;
document.addEventListener("submit", (event) => {
  saving = event.target.closest(".rcard")?.id ?? null;
});
document.addEventListener("htmx:after:settle", () => {
  const focused = document.activeElement;
  if (saving && (focused === document.body || focused.offsetParent === null)) {
    document.getElementById(saving)?.querySelector("summary")?.focus({ preventScroll: true });
  }
  saving = null;
});
