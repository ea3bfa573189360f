// Says that a table is being read, since a large one takes a while; sending it twice would bring it twice.
document.querySelector(".bringf")?.addEventListener("submit", (event) => {
  event.target.querySelector(".reading").hidden = false;
  event.target.querySelector("button").disabled = true;
});
window.addEventListener("pageshow", () => {
  const button = document.querySelector(".bringf button");
  if (button) button.disabled = false;
});
