"use strict";
// Draws the charts of the page into their places, in the colours that the system asks for.
(() => {
  const page = document.querySelector("[data-charts]");
  if (page === null) return;
  const dark = window.matchMedia("(prefers-color-scheme: dark)");

  const draw = async () => {
    const scheme = dark.matches ? "dark" : "light";
    try {
      const answer = await fetch(`${page.dataset.charts}&scheme=${scheme}`);
      if (!answer.ok) throw new Error(`the server said ${answer.status}`);
      for (const [id, item] of Object.entries(await answer.json())) {
        const place = document.getElementById(id);
        place.replaceChildren();
        await window.Bokeh.embed.embed_item(item, id);
      }
      page.dataset.drawn = scheme;
    } catch (error) {
      for (const place of document.querySelectorAll(".chart")) {
        place.textContent = "The chart could not be drawn; its table says the same.";
      }
      for (const table of document.querySelectorAll("details.numbers")) table.open = true;
      console.error(error);
    }
  };

  dark.addEventListener("change", draw);
  draw();
  for (const picker of document.querySelectorAll("form.pickers select, form.pickers input")) {
    picker.addEventListener("change", () => picker.form.requestSubmit());
  }
})();
