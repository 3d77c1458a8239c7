"use strict";
(() => {
  const SVG = "http://www.w3.org/2000/svg";
  const share = /share of time/;

  function number(value, axis) {
    if (value === null) return "none";
    if (share.test(axis.name)) return `${Number((100 * value).toPrecision(3))} %`;
    return `${Number(value.toPrecision(4))}`;
  }
  function unit(axis) {
    const cut = axis.name.lastIndexOf(",");
    return cut < 0 || share.test(axis.name) ? "" : " " + axis.name.slice(cut + 1).trim();
  }
  function forward(value, axis) {
    const f = axis.log ? Math.log : (v) => v;
    return (f(value) - f(axis.from)) / (f(axis.to) - f(axis.from));
  }
  function back(part, axis) {
    if (!axis.log) return axis.from + part * (axis.to - axis.from);
    return Math.exp(Math.log(axis.from) + part * (Math.log(axis.to) - Math.log(axis.from)));
  }
  function nearest(places, value) {
    let low = 0;
    let high = places.length - 1;
    while (high - low > 1) {
      const middle = (low + high) >> 1;
      if (places[middle] <= value) low = middle; else high = middle;
    }
    return value - places[low] <= places[high] - value ? low : high;
  }

  for (const figure of document.querySelectorAll("figure.picture")) {
    const data = figure.querySelector("script.readings");
    if (!data) continue;
    const panels = JSON.parse(data.textContent);
    const drawing = figure.querySelector(".drawing");
    const svg = drawing.querySelector("svg");
    const output = figure.querySelector("output");
    const line = document.createElementNS(SVG, "line");
    line.setAttribute("stroke", "#1d2733");
    line.setAttribute("stroke-width", "1");
    line.setAttribute("stroke-dasharray", "3 3");
    line.setAttribute("visibility", "hidden");
    svg.append(line);
    let panel = panels[0];
    let index = -1;

    function show(which, x) {
      panel = which;
      index = nearest(panel.curves[0].x, x);
      const place = panel.curves[0].x[index];
      const [left, top, right, bottom] = panel.box;
      const at = left + forward(place, panel.x) * (right - left);
      for (const [key, value] of [["x1", at], ["x2", at], ["y1", top], ["y2", bottom]]) {
        line.setAttribute(key, value);
      }
      line.setAttribute("visibility", at >= left && at <= right ? "visible" : "hidden");
      const said = panel.curves.map((curve) => {
        const k = nearest(curve.x, place);
        const inside = place >= curve.x[0] && place <= curve.x[curve.x.length - 1];
        return `${curve.name} ${inside ? number(curve.y[k], panel.y) + unit(panel.y) : "not shown"}`;
      });
      output.textContent = `at ${number(place, panel.x)}${unit(panel.x)}: ${said.join("; ")}`;
    }
    drawing.addEventListener("pointermove", (event) => {
      const matrix = svg.getScreenCTM();
      if (!matrix) return;
      const point = new DOMPoint(event.clientX, event.clientY).matrixTransform(matrix.inverse());
      for (const one of panels) {
        const [left, , right] = one.box;
        if (point.x < left || point.x > right) continue;
        show(one, back((point.x - left) / (right - left), one.x));
        return;
      }
    });
    drawing.addEventListener("keydown", (event) => {
      const key = { ArrowLeft: -1, ArrowRight: 1 }[event.key];
      if (!key) return;
      const step = panel.x.from <= panel.x.to ? key : -key;
      event.preventDefault();
      const places = panel.curves[0].x;
      const least = Math.min(panel.x.from, panel.x.to);
      const first = step > 0 ? places.findIndex((x) => x >= least) : places.length - 1;
      const start = index < 0 ? first : index + step;
      const next = Math.min(Math.max(start, 0), places.length - 1);
      show(panel, places[next]);
    });
  }
})();
