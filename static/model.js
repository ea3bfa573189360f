// Draws the size curve for exploring, once its part of the page is opened; the plotting library is loaded only then.
function load(address) {
  return new Promise((resolve, reject) => {
    if (window.Plotly) return resolve();
    const script = document.createElement("script");
    script.src = address;
    script.onload = resolve;
    script.onerror = reject;
    document.head.append(script);
  });
}

async function draw(part) {
  const place = part.querySelector(".drawing");
  const figure = JSON.parse(part.querySelector(".figure").textContent);
  try {
    await load(part.dataset.plotly);
    await window.Plotly.react(place, figure.data, figure.layout, { responsive: true, displaylogo: false });
  } catch {
    place.textContent = "The plot could not be loaded. The drawing above and the table show the same numbers.";
  }
}

document.addEventListener("toggle", (event) => {
  if (event.target.id === "explore" && event.target.open) draw(event.target);
}, true);

document.addEventListener("htmx:after:swap", () => {
  const part = document.getElementById("explore");
  if (part?.open) draw(part);
});
