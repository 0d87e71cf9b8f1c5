package main

import (
	"bytes"
	"path/filepath"
	"testing"

	"github.com/chromedp/chromedp"
)

// contrast lists texts whose colour is too near to that of what they stand on: less
// than 4.5 to 1, as the Web Content Accessibility Guidelines count it.
const contrast = `(function () {
	var rgb = s => (s.match(/[\d.]+/g) || []).map(Number);
	var light = c => { var l = c.slice(0, 3).map(v => { v /= 255; return v <= 0.03928 ? v / 12.92 : Math.pow((v + 0.055) / 1.055, 2.4) }); return 0.2126 * l[0] + 0.7152 * l[1] + 0.0722 * l[2] };
	var below = e => { for (; e; e = e.parentElement) { var c = rgb(getComputedStyle(e).backgroundColor); if (c.length < 4 || c[3] === 1) return c } return [255, 255, 255] };
	var bad = {};
	document.querySelectorAll("body *").forEach(e => {
		if (!Array.from(e.childNodes).some(n => n.nodeType === 3 && n.data.trim()) || e.closest("script, title, desc")) return;
		var s = getComputedStyle(e), a = light(rgb(e.closest("svg") ? s.fill : s.color)), b = light(e.closest("svg") ? [255, 255, 255] : below(e));
		var ratio = (Math.max(a, b) + 0.05) / (Math.min(a, b) + 0.05);
		if (ratio < 4.5) bad[e.tagName + "." + e.getAttribute("class") + " " + ratio.toFixed(2)] = true;
	});
	return Object.keys(bad).join("; ");
})()`

// structure lists what somebody who listens to a page, or goes through it by keys,
// would miss.
const structure = `(function () {
	var bad = [], last = 0;
	document.querySelectorAll("h1, h2, h3, h4").forEach(h => { var n = Number(h.tagName[1]); if (n > last + 1) bad.push("after a heading of level " + last + " comes " + h.textContent); last = n });
	["main", "body > header", "body > footer"].forEach(s => { if (document.querySelectorAll(s).length !== 1) bad.push("not one " + s) });
	document.querySelectorAll("table").forEach(t => { if (!t.querySelector("th[scope]") && !t.hasAttribute("aria-label")) bad.push("a table without heads: " + t.className) });
	document.querySelectorAll("th:not([scope])").forEach(t => bad.push("a head without a scope: " + t.textContent));
	document.querySelectorAll("select, input").forEach(s => { if (!s.labels.length) bad.push("a field without a label: " + s.id) });
	document.querySelectorAll("svg").forEach(s => { if (!s.querySelector("title").textContent || !s.querySelector("desc").textContent || !s.getAttribute("aria-labelledby").split(" ").every(id => document.getElementById(id))) bad.push("a chart without words") });
	document.querySelectorAll("details").forEach(d => { if (!d.querySelector("summary").textContent.trim()) bad.push("a fold without a name") });
	document.querySelectorAll("a").forEach(a => { if (!document.querySelector(a.getAttribute("href"))) bad.push("a link to nothing: " + a.textContent) });
	var ids = Array.from(document.querySelectorAll("[id]")).map(e => e.id);
	if (new Set(ids).size !== ids.length) bad.push("an id stands twice");
	return bad.slice(0, 9).join("; ");
})()`

// The pages are readable for those who see little or nothing and use no mouse.
func TestReadablePages(t *testing.T) {
	ctx := browser(t)
	dir := filepath.Join(t.TempDir(), "demo")
	var out, remarks bytes.Buffer
	if status := run(t.Context(), []string{"demo", dir}, nil, &out, &remarks); status != statusDone {
		t.Fatalf("status %d: %s", status, &remarks)
	}
	point, stretch := filepath.Join(dir, "point.html"), filepath.Join(dir, "stretch.html")
	call(t, "--repo", dir, "trace", "--route", "BW1", "--at", "34", "--out", point).want(t, 0)
	call(t, "--repo", dir, "trace", "--route", "BW1", "--from", "30", "--to", "45", "--train", "IC", "--out", stretch).want(t, 0)
	for _, page := range []string{filepath.Join(dir, "change-report.html"), point, stretch} {
		if err := chromedp.Do(ctx, chromedp.Navigate("file://"+filepath.ToSlash(page))); err != nil {
			t.Fatal(err)
		}
		if bad := ask[string](t, ctx, contrast); bad != "" {
			t.Errorf("%s: too little contrast: %s", filepath.Base(page), bad)
		}
		if bad := ask[string](t, ctx, structure); bad != "" {
			t.Errorf("%s: %s", filepath.Base(page), bad)
		}
	}
	// What the pointer shows in a chart, the arrow keys show as well.
	if err := chromedp.Do(ctx, chromedp.Navigate("file://"+filepath.ToSlash(filepath.Join(dir, "change-report.html")))); err != nil {
		t.Fatal(err)
	}
	shown := ask[string](t, ctx, `(function () { var svg = document.querySelector("svg.chart"), p = svg.closest(".panel").querySelector(".pointer"), seen = [];
		svg.focus();
		svg.dispatchEvent(new FocusEvent("focus")); // a browser without a window gives none
		["ArrowRight", "End", "Home"].forEach(key => { svg.dispatchEvent(new KeyboardEvent("keydown", {key: key, bubbles: true})); seen.push(/^km .*before.*after/.test(p.textContent) ? p.textContent : "nothing") });
		var live = p.getAttribute("aria-live"); svg.dispatchEvent(new FocusEvent("blur"));
		return document.activeElement === svg && p.textContent === "" && new Set(seen).size === 3 && !seen.includes("nothing") ? live : seen.join("; ") })()`)
	if shown != "polite" {
		t.Errorf("by keys a chart shows %s", shown)
	}
}
