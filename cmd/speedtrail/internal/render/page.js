(function () {
  "use strict";
  var form = document.querySelector(".filter");
  if (form) {
    form.hidden = false;
    var train = document.getElementById("train"), route = document.getElementById("route"), count = document.getElementById("count");
    var articles = Array.prototype.slice.call(document.querySelectorAll("article"));
    var show = function () {
      var n = 0;
      articles.forEach(function (a) {
        var hit = (!route.value || a.dataset.route === route.value) && (!train.value || a.dataset.trains.split("\n").indexOf(train.value) >= 0);
        a.hidden = !hit;
        if (hit) n++;
      });
      count.textContent = n === articles.length ? "" : n + " of " + articles.length + " shown";
    };
    train.addEventListener("change", show);
    route.addEventListener("change", show);
    // A link to what the filter hides lifts the filter.
    document.addEventListener("click", function (e) {
      var a = e.target.closest('a[href^="#"]'), to = a && document.getElementById(a.getAttribute("href").slice(1));
      if (to && to.closest("[hidden]")) { train.value = route.value = ""; show(); }
    });
  }
  // On paper nothing is folded away.
  var folded = [];
  window.addEventListener("beforeprint", function () {
    folded = Array.prototype.slice.call(document.querySelectorAll("details:not([open])"));
    folded.forEach(function (d) { d.open = true; });
  });
  window.addEventListener("afterprint", function () {
    folded.forEach(function (d) { d.open = false; });
    folded = [];
  });
  Array.prototype.forEach.call(document.querySelectorAll(".scripted"), function (x) { x.hidden = false; });
  // What is wider than its place can be moved with the keys.
  var scrollers = Array.prototype.slice.call(document.querySelectorAll(".wide, .figure"));
  var fit = function () {
    scrollers.forEach(function (x) {
      if (x.scrollWidth > x.clientWidth + 1) {
        x.tabIndex = 0;
        x.setAttribute("role", "group");
        x.setAttribute("aria-label", "wider than the screen, move it sideways");
      } else ["tabindex", "role", "aria-label"].forEach(function (name) { x.removeAttribute(name); });
    });
  };
  window.addEventListener("resize", fit);
  fit();
  var read = function (s) { return s ? s.split(";").map(function (p) { return p.split(",").map(Number); }) : []; };
  var at = function (list, s) { for (var i = 0; i < list.length; i++) if (s >= list[i][0] && s < list[i][1]) return list[i]; return null; };
  Array.prototype.forEach.call(document.querySelectorAll("svg.chart"), function (svg) {
    var d = svg.dataset, before = read(d.before), after = read(d.after), km = read(d.km);
    var out = svg.closest(".panel").querySelector(".pointer");
    var from = Number(d.from), to = Number(d.to), here = from;
    var show = function (s) {
      var segment = at(km, s), b = at(before, s), a = at(after, s);
      out.textContent = segment && a ? "km " + ((segment[2] + s - segment[0]) / 1e6).toFixed(3).replace("-", "\u2212") + ":  before " + (b ? b[2] + " km/h" : "no track") + ", after " + a[2] + " km/h" : "";
    };
    svg.addEventListener("pointermove", function (e) {
      var box = svg.getBoundingClientRect(), x = (e.clientX - box.left) * d.width / box.width;
      show(from + (x - d.left) / (d.right - d.left) * (to - from));
    });
    svg.addEventListener("pointerleave", function () { out.textContent = ""; });
    // The arrow keys do what the pointer does, a hundredth of the chart at a time.
    svg.tabIndex = 0;
    svg.addEventListener("focus", function () { // read aloud only for those who ask by keys
      out.setAttribute("aria-live", "polite");
      if (svg.matches(":focus-visible")) show(here);
    });
    svg.addEventListener("blur", function () { out.setAttribute("aria-live", "off"); out.textContent = ""; });
    svg.addEventListener("keydown", function (e) {
      var step = { ArrowLeft: -1, ArrowRight: 1, Home: -101, End: 101 }[e.key];
      if (!step || e.altKey || e.ctrlKey || e.metaKey) return;
      here = Math.min(to - 1, Math.max(from, here + step * (e.shiftKey ? 10 : 1) * (to - from) / 100));
      show(here);
      e.preventDefault();
    });
  });
})();
