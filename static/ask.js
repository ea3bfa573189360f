/* Ask without reloading: what was clicked keeps its place and its focus, and silence of the program is said. */
(() => {
  let clicked = null;
  let doubted = null;

  const say = (silent) => {
    const gone = document.getElementById("gone");
    if (gone) gone.hidden = !silent;
  };

  /* Scroll so that the control stands where it stood; where the page has become too short for that, lengthen it. */
  const keepPlace = (control, top) => {
    document.body.style.paddingBottom = "";
    const off = () => control.getBoundingClientRect().top - top;
    const before = off();
    scrollBy(0, before);
    const left = off();
    if (before > 0 && left > 1) {
      document.body.style.paddingBottom = `${Math.ceil(left)}px`;
      scrollBy(0, left);
    }
  };

  document.addEventListener("htmx:before:request", (event) => {
    if (event.target.matches?.(".doubt")) return;
    const source = event.target;
    const control = source.matches?.("form") ? source.querySelector(":focus") : source.closest?.("a, button, input");
    clicked = control && document.getElementById("ask")?.contains(control)
      ? { id: control.id, then: control.dataset.then, hash: control.hash, top: control.getBoundingClientRect().top }
      : null;
  });

  /* A page that asks nothing, such as a refusal, is opened whole.
     The doubt over sampled models comes by itself: what has the focus stays where it is. */
  document.addEventListener("htmx:before:swap", (event) => {
    const { text, request, response } = event.detail?.ctx ?? {};
    if (text && !text.includes('id="ask"')) {
      event.preventDefault();
      location.assign(response?.raw?.url || request.action);
      return;
    }
    const here = document.activeElement;
    const comes = event.detail?.ctx?.sourceElement?.matches?.(".doubt") && document.getElementById("ask")?.contains(here);
    doubted = comes && here.id ? { id: here.id, top: here.getBoundingClientRect().top } : null;
  });

  document.addEventListener("htmx:after:swap", () => {
    if (doubted) {
      const here = document.getElementById(doubted.id);
      if (here) keepPlace(here, doubted.top);
      doubted = null;
      return;
    }
    if (!clicked) return;
    const { id, then, hash, top } = clicked;
    clicked = null;
    say(false);
    if (hash) {
      const card = document.getElementById(decodeURIComponent(hash.slice(1)));
      card?.focus({ preventScroll: true });
      card?.scrollIntoView({ block: "center" });
      return;
    }
    const kept = id && document.getElementById(id);
    if (kept) keepPlace(kept, top);
    if (document.activeElement === document.body || !document.activeElement?.isConnected) {
      (kept || (then && document.getElementById(then)))?.focus({ preventScroll: true });
    }
  });

  document.addEventListener("htmx:error", () => {
    say(true);
  });
})();
