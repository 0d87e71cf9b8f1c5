package render

import (
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// A change that nobody has asked for and that has no chart stands in a table, and its
// finding leads there; others are counted.
func TestPageUndrawn(t *testing.T) {
	d := pageDocument("R1")
	c := &d.Computed
	c.Stretches = assessment.Stretches{LeftOut: 2, List: []assessment.Stretch{}}
	r := &c.Routes[0]
	r.Pieces = append(r.Pieces, []assessment.Piece{{By: -1, From: "2.000", To: "3.000"}})
	other := r.Changes[0]
	other.From, other.To, other.Start, other.Pieces = "2.000", "3.000", 2e6, 1
	r.Changes = append(r.Changes, other)
	c.Findings[0].From, c.Findings[0].To = "2.000", "3.000"
	s := pageOf(t, d)
	if !strings.Contains(s, "<a href=\"#u1\">R1 nominal, km\u00a02.000 to 3.000</a>") || !strings.Contains(s, "<option>R1</option>") {
		t.Error("the finding does not lead to the change, or the filter lacks the route")
	}
	_, s, _ = strings.Cut(s, "<h3>Outside, without a chart</h3>")
	s, _, _ = strings.Cut(s, "</section>")
	if !strings.Contains(s, `<tbody id="u1"><tr class="raised"><td>2.000</td>`) || strings.Contains(s, "<td>1.000</td>") || !strings.Contains(s, "<p>1 more change") {
		t.Errorf("the section is not of the one and counts the other: %.900s", s)
	}
	p := page{C: c, ShownRows: mostHTMLRows}
	if p.fillUndrawn(); len(p.Undrawn) != 0 || p.UndrawnLeft != 2 {
		t.Errorf("without room: %d tables, %d changes left out", len(p.Undrawn), p.UndrawnLeft)
	}
}
