(function () {
  "use strict";
  var figures = JSON.parse(document.getElementById("plot-data").textContent);
  var scheme = window.matchMedia("(prefers-color-scheme: dark)");
  // what an A4 sheet has between its margins, in CSS pixels
  var PAPER = 660;
  var names = ["ink", "soft", "rule", "paper", "line", "density0", "density1", "series0", "series1", "series2", "series3"];

  function palette() {
    var style = getComputedStyle(document.documentElement), found = {};
    names.forEach(function (name) { found[name] = style.getPropertyValue("--" + name).trim(); });
    return found;
  }

  // a copy of a figure in which "$ink" has become a colour
  function inked(node, colours) {
    if (typeof node === "string") {
      return node.charAt(0) === "$" && colours[node.slice(1)] ? colours[node.slice(1)] : node;
    }
    if (Array.isArray(node)) { return node.map(function (part) { return inked(part, colours); }); }
    if (node && typeof node === "object") {
      var copy = {};
      Object.keys(node).forEach(function (key) { copy[key] = inked(node[key], colours); });
      return copy;
    }
    return node;
  }

  function draw(place, paper) {
    var figure = figures[place.dataset.plot];
    if (!figure || typeof Plotly === "undefined") { return; }
    var colours = palette(), copy = inked(figure, colours), layout = copy.layout;
    layout.paper_bgcolor = "rgba(0,0,0,0)";
    layout.plot_bgcolor = "rgba(0,0,0,0)";
    layout.font = { color: colours.ink, family: getComputedStyle(document.body).fontFamily, size: 12 };
    layout.autosize = !paper;
    if (paper) { layout.width = PAPER; }
    Object.keys(layout).forEach(function (key) {
      if (/^[xy]axis/.test(key)) {
        layout[key] = Object.assign({ gridcolor: colours.rule, zerolinecolor: colours.soft, linecolor: colours.soft, automargin: true }, layout[key]);
      }
    });
    place.style.height = layout.height + 4 + "px";
    place.dataset.drawn = "yes";
    Plotly.react(place, copy.data, layout, { displayModeBar: false, responsive: true });
  }

  var places = Array.prototype.slice.call(document.querySelectorAll(".plot"));
  if ("IntersectionObserver" in window) {
    var watcher = new IntersectionObserver(function (entries) {
      entries.forEach(function (entry) {
        if (entry.isIntersecting) { watcher.unobserve(entry.target); draw(entry.target, false); }
      });
    }, { rootMargin: "300px" });
    places.forEach(function (place) { watcher.observe(place); });
  } else {
    places.forEach(function (place) { draw(place, false); });
  }

  function again() { places.forEach(function (place) { if (place.dataset.drawn) { draw(place, false); } }); }
  if (scheme.addEventListener) { scheme.addEventListener("change", again); }
  // figures that were not yet in sight are printed too; those folded away are not
  window.addEventListener("beforeprint", function () {
    places.forEach(function (place) { if (!place.closest("details")) { draw(place, true); } });
  });
  window.addEventListener("afterprint", again);
})();
