"use strict";
// Draws the charts of a page, keeps its live parts fresh, and lets its pickers act at once.
(() => {
  const dark = window.matchMedia("(prefers-color-scheme: dark)");
  const page = document.querySelector("[data-charts]");
  // This script runs before the large one of the charts, so that both are under way at once.
  const loaded = new Promise((done) => document.addEventListener("DOMContentLoaded", done, { once: true }));

  const draw = async () => {
    const scheme = dark.matches ? "dark" : "light";
    try {
      const answer = await fetch(`${page.dataset.charts}&scheme=${scheme}`);
      if (!answer.ok) throw new Error(`the server said ${answer.status}`);
      const items = await answer.json();
      await loaded;
      for (const [id, item] of Object.entries(items)) {
        const place = document.getElementById(id);
        if (place === null) continue;
        place.replaceChildren();
        await window.Bokeh.embed.embed_item(item, id);
      }
      page.dataset.drawn = scheme;
    } catch (error) {
      for (const place of document.querySelectorAll(".chart")) {
        place.textContent = "The chart could not be drawn; its table says the same.";
      }
      openTables();
      console.error(error);
    }
  };

  const openTables = () => {
    for (const table of document.querySelectorAll("details.numbers")) table.open = true;
  };

  // A part of the page that the server writes again every few seconds; nothing is asked while nobody looks.
  const refresh = async (part) => {
    if (document.hidden) return;
    try {
      const answer = await fetch(part.dataset.live, { redirect: "error" });
      if (!answer.ok) return;
      const text = await answer.text();
      if (text !== part.dataset.last) {
        part.dataset.last = text;
        part.innerHTML = text;
      }
    } catch {
      // the server is away for a moment: what stands there stays
    }
  };

  // on a phone the row of questions is longer than the screen
  document.querySelector(".questions [aria-current]")?.scrollIntoView({ block: "nearest", inline: "center" });
  if (page !== null) {
    dark.addEventListener("change", draw);
    draw();
  }
  for (const part of document.querySelectorAll("[data-live]")) {
    setInterval(refresh, 1000 * Number(part.dataset.everySeconds), part);
  }
  for (const picker of document.querySelectorAll("form.pick select, form.pick input")) {
    picker.addEventListener("change", () => picker.form.requestSubmit());
  }
  window.addEventListener("beforeprint", openTables);
})();
