// Loaded before anything is drawn, so that a dark-adapted eye never meets a
// white page. The choice is remembered in this browser.
(() => {
  let chosen = null;
  try { chosen = localStorage.getItem("theme"); } catch { /* without storage the choice lasts as long as the page */ }
  if (chosen !== "day" && chosen !== "night") {
    chosen = matchMedia("(prefers-color-scheme: dark)").matches ? "night" : "day";
  }
  document.documentElement.dataset.theme = chosen;
})();
