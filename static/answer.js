/* The button that opens the browser's own print dialogue; without scripts it stays away. */
const button = document.getElementById("print");
button.hidden = false;
button.addEventListener("click", () => window.print());
