"use strict";
/* Reads a chart: by the slider under it, or where the pointer is. Charts may come and go with the page. */
{
  const readings = new WeakMap();
  const of = (figure) => {
    if (!readings.has(figure)) readings.set(figure, JSON.parse(figure.dataset.readings));
    return readings.get(figure);
  };
  const show = (figure) => {
    const slider = figure.querySelector("input[type=range]");
    const [at, words, heights] = of(figure)[slider.value];
    const cursor = figure.querySelector(".cursor");
    cursor.setAttribute("transform", `translate(${at})`);
    cursor.classList.add("on");
    cursor.querySelectorAll(".dot").forEach((dot, k) => {
      dot.classList.toggle("off", heights[k] === null);
      dot.setAttribute("cy", heights[k] ?? 0);
    });
    slider.setAttribute("aria-valuetext", words);
    figure.querySelector("output").textContent = words;
  };
  document.documentElement.classList.add("scripted");
  const figureOf = (event) => event.target instanceof Element ? event.target.closest("figure[data-readings]") : null;
  for (const kind of ["input", "focusin"]) {
    document.addEventListener(kind, (event) => {
      if (event.target.matches?.("figure[data-readings] input")) show(figureOf(event));
    });
  }
  document.addEventListener("pointermove", (event) => {
    const plot = event.target instanceof Element && event.target.closest("figure[data-readings] .plot");
    if (!plot) return;
    const figure = figureOf(event);
    const place = new DOMPoint(event.clientX, event.clientY).matrixTransform(plot.getScreenCTM().inverse()).x;
    let best = 0;
    of(figure).forEach(([at], k, all) => { if (Math.abs(at - place) < Math.abs(all[best][0] - place)) best = k; });
    figure.querySelector("input[type=range]").value = best;
    show(figure);
  });
}
