package render

import (
	"fmt"
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// A page says "no finding" where there is none, and once what many findings end with;
// a long list of trains stands apart from what happens.
func TestPageFindings(t *testing.T) {
	d := pageDocument("R1")
	d.Computed.Findings = nil
	if s := pageOf(t, d); !strings.Contains(s, "<h2>What needs eyes first</h2>\n<p>No finding.</p>") || !strings.Contains(s, `<a href="#findings">`) {
		t.Error("without findings the page does not say so")
	}
	var ids []string
	for i := range 30 {
		ids = append(ids, fmt.Sprintf("T%02d", i))
	}
	many := strings.Join(ids, ", ")
	for _, trains := range []string{many, "A (B)"} {
		d.Computed.Findings = append(d.Computed.Findings, assessment.Finding{ID: assessment.Outside, Route: "R1", Direction: "nominal", From: "8.000", To: "9.000",
			Text: "raised by up to 20 km/h, 60 to 80 (" + trains + "), run-out of the train length: nobody asked"})
	}
	d.Computed.Findings = append(d.Computed.Findings, assessment.Finding{ID: "step-size", Text: "text"})
	s := pageOf(t, d)
	for _, want := range []string{
		`<a href="#f1">outside (2)</a> &middot; <a href="#f2">step-size</a>`, `<div class="finding" id="f2">`, "Of each: nobody asked.",
		"raised by up to 20\u00a0km/h, 60 to 80, run-out of the train length<br><span class=\"fine who\">" + many + "</span>",
		"raised by up to 20\u00a0km/h, 60 to 80 (A (B)), run-out of the train length</li>",
		`<a href="#t1">R1 nominal`, `<tbody id="t1">`,
	} {
		if !strings.Contains(s, want) {
			t.Errorf("no %s", want)
		}
	}
	if n := strings.Count(s, "nobody asked"); n != 1 {
		t.Errorf("what both end with stands there %d times", n)
	}
}

// The terminal names each train of a few findings; of many it keeps what happens.
func TestTextFindingsWithManyTrains(t *testing.T) {
	trains := strings.Repeat("EXPRESS, ", 20) + "ORE"
	for _, n := range []int{2, 9} {
		c := &assessment.Computed{}
		for i := range n {
			c.Findings = append(c.Findings, assessment.Finding{ID: assessment.Outside, Route: "R1", From: fmt.Sprintf("%d.000", i), To: "9.000", Text: "raised by up to 20 km/h, 60 to 80 (" + trains + "): nobody asked"})
		}
		var b strings.Builder
		(&textWriter{w: &b, d: &assessment.Document{}, c: c, s: Style{Width: 100}}).findings()
		if named, told := strings.Contains(b.String(), "ORE"), strings.Contains(b.String(), "Long lists of trains stand in the report"); named != (n == 2) || told == named {
			t.Errorf("%d findings: trains are named: %v, the report is named: %v", n, named, told)
		}
	}
}

// Nothing parts a number from its unit, or the position from km.
func TestTied(t *testing.T) {
	for _, x := range [][2]string{
		{"lowered by 20 km/h at km 1.500, over 0.600 km (A)", "lowered by 20_km/h at km_1.500, over 0.600_km (A)"},
		{"to \u221220 km/h", "to \u221220_km/h"}, {"two  blanks", "two  blanks"}, {"", ""},
	} {
		if got := strings.ReplaceAll(tied(x[0]), "\u00a0", "_"); got != x[1] {
			t.Errorf("%q: got %q, want %q", x[0], got, x[1])
		}
	}
}

// Running times of one part each have no column for parts.
func TestPageRunParts(t *testing.T) {
	d := pageDocument("R1")
	part := assessment.RunPart{From: "0.000", To: "4.000", Gain: 20}
	d.Computed.Figures.Runs = []assessment.RunFigure{{Route: "R1", Train: "R1", Parts: []assessment.RunPart{part}}}
	if strings.Contains(pageOf(t, d), "where it comes from, s</th>") {
		t.Error("a column without anything in it")
	}
	d.Computed.Figures.Runs[0].Parts = []assessment.RunPart{part, part}
	if s := pageOf(t, d); !strings.Contains(s, "where it comes from, s</th>") || !strings.Contains(s, "km\u00a00.000 to 4.000: \u22122.0") {
		t.Error("the parts of a running time are missing")
	}
}

// The verdict says most in its first sentence; the others stand below it, each on a
// line of its own.
func TestVerdictParts(t *testing.T) {
	d := pageDocument("R1")
	parts := verdictParts(d)
	if got := strings.Join(parts, " "); len(parts) < 3 || got != Verdict(d) {
		t.Fatalf("%d parts: %s", len(parts), got)
	}
	html := `<h2>Verdict</h2><p>` + tied(parts[0]) + `</p><ul><li>` + tied(parts[1]) + `</li><li>`
	if s := pageOf(t, d); !strings.Contains(s, html) {
		t.Errorf("no %s", html)
	}
	var b strings.Builder
	if err := Markdown(&b, d, Record{}); err != nil {
		t.Fatal(err)
	}
	if want := "## Verdict\n\n**" + md(parts[0]) + "**\n\n- " + md(parts[1]) + "\n- "; !strings.Contains(b.String(), want) {
		t.Errorf("no %s", want)
	}
}
