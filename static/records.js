// With a script the Save button of a card shows once something in the card was changed.
document.documentElement.classList.add("scripted");
document.addEventListener("change", (event) => {
  event.target.closest?.(".rcard")?.classList.add("dirty");
});
