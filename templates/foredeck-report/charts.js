/* Draws the charts of a page from their data elements, in the page's own colours, and again when
   the width, the colour scheme or the medium changes. Without plotly.js each chart says so. */
(function () {
  "use strict";
  var slots = [].slice.call(document.querySelectorAll("[data-chart]"));
  if (!window.Plotly) {
    slots.forEach(function (slot) {
      slot.outerHTML = '<p class="off">The chart could not be drawn; its numbers are in the table below it.</p>';
    });
    return;
  }
  function textOf(id) { return document.getElementById(id).textContent; }
  var specs = slots.map(function (slot) { return textOf(slot.dataset.chart); });
  var theme = textOf("chart-template"), names = JSON.parse(textOf("token-names"));
  var dark = matchMedia("(prefers-color-scheme: dark)"), paper = matchMedia("print");
  var options = { displayModeBar: false, scrollZoom: false, doubleClick: false, showTips: false };

  /* Charts are made in the light colours; every one is swapped for what its token is now. */
  function coloured(text) {
    var css = getComputedStyle(document.documentElement);
    return text.replace(/#[0-9A-Fa-f]{6}/g, function (hex) {
      var name = names[hex.toUpperCase()];
      return name ? css.getPropertyValue("--" + name).trim() : hex;
    });
  }
  function merge(into, changes) {
    Object.keys(changes).forEach(function (key) {
      var value = changes[key];
      if (value && typeof value === "object" && !Array.isArray(value) && into[key]) merge(into[key], value);
      else into[key] = value;
    });
    return into;
  }
  function shrink(trace, scale) {
    var marker = trace.marker;
    if (!marker || trace.type !== "scatter") return;
    if (typeof marker.size === "number") marker.size *= scale;
    else if (Array.isArray(marker.size)) marker.size = marker.size.map(function (size) { return size * scale; });
    if (marker.line && typeof marker.line.width === "number") marker.line.width *= 0.85;
  }
  function drawOne(slot, spec, width, printed, first) {
    var figure = JSON.parse(coloured(spec)), layout = figure.layout;
    layout.template = JSON.parse(coloured(theme));
    if (width < 560) {
      var scale = figure.narrow.scale;
      delete figure.narrow.scale;
      merge(layout, figure.narrow);
      if (scale) figure.data.forEach(function (trace) { shrink(trace, scale); });
    }
    layout.width = width;
    /* The first chart is lowest on paper, so that it stands on page 1 under the answers. */
    if (printed) layout.height = Math.round(layout.height * (first ? 0.68 : 0.8));
    slot.style.minHeight = layout.height + "px";
    var config = Object.assign({ staticPlot: printed }, options);
    window.Plotly.react(slot, figure.data, layout, config);
  }
  function draw(printed) {
    slots.forEach(function (slot, i) { drawOne(slot, specs[i], printed ? 640 : slot.clientWidth, printed, i === 0); });
    document.documentElement.dataset.charts = String(slots.length);
  }
  var waiting;
  addEventListener("resize", function () {
    if (paper.matches) return;
    clearTimeout(waiting);
    waiting = setTimeout(function () { draw(false); }, 120);
  });
  dark.addEventListener("change", function () { draw(paper.matches); });
  paper.addEventListener("change", function (event) { draw(event.matches); });
  addEventListener("beforeprint", function () { draw(true); });
  addEventListener("afterprint", function () { draw(false); });
  draw(paper.matches);
})();
