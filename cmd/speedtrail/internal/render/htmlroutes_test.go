package render

import (
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// Where many routes change, a table sums them up: what lies outside first, each with
// a link to its first chart or table.
func TestPageRoutes(t *testing.T) {
	d := pageDocument("R1")
	c := &d.Computed
	c.Routes[0].Masked, c.Routes[0].Track = nil, nil
	add := func(id string) {
		r := c.Routes[0]
		r.ID = id
		r.Changes = append([]assessment.Change{}, r.Changes...)
		c.Routes = append(c.Routes, r)
	}
	add("R2")
	add("R3")
	if s := pageOf(t, d); strings.Contains(s, "Routes that change") {
		t.Error("three routes need no table")
	}
	add("R4")
	c.Routes[3].Changes[0].After = 40
	c.Routes[3].Pieces = [][]assessment.Piece{{}}
	c.Findings = []assessment.Finding{{ID: assessment.Outside, Route: "R4", Text: "text"}, {ID: "step-size", Route: "R2", Text: "text"}}
	s := pageOf(t, d)
	_, s, ok := strings.Cut(s, "<h2>Routes that change</h2>")
	s, _, _ = strings.Cut(s, "</section>")
	if !ok {
		t.Fatal("no table")
	}
	for _, want := range []string{
		`<a href="#u1">R4</a> <span class="fine name">R1</span></th><td></td><td>` + "\u2212" + `20</td><td>1</td><td><b class="outside">1</b></td>`,
		`<a href="#s1">R1</a> <span class="fine name">R1</span></th><td>&#43;20</td><td></td><td>1</td><td></td>`,
		`<th scope="row">R2 <span`,
	} {
		if !strings.Contains(s, want) {
			t.Errorf("no %s in\n%s", want, s)
		}
	}
	if strings.Index(s, ">R4<") > strings.Index(s, ">R1<") {
		t.Error("what lies outside does not come first")
	}
}
