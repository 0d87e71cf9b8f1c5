package render

import (
	"fmt"
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// comb is a stretch of n changes of a length, each with a run-out where that has a
// length, and unchanged track between them. Every level has a row of its own.
func comb(n int, length, runOut, gap int64) (*assessment.Computed, *assessment.Stretch) {
	r := assessment.Route{ID: "R", Start: "0.000", End: "200.000", Sources: [][]assessment.Source{{{File: "routes/r/speed.csv", Kind: "basic", Line: 1, Value: 100}}}}
	s := assessment.Stretch{Direction: "nominal", Trains: []int{0}}
	at := 2 * gap
	level := func(from, to int64, before, after int) {
		r.Sources = append(r.Sources, []assessment.Source{{File: "routes/r/speed.csv", Kind: "basic", Line: 2 + len(r.Sources), Value: after}})
		s.Before = append(s.Before, assessment.Step{From: from, To: to, Speed: before})
		s.After = append(s.After, assessment.Step{From: from, To: to, Speed: after, Source: len(r.Sources) - 1})
	}
	change := func(length int64, runOut bool) {
		s.Changes = append(s.Changes, len(r.Changes))
		r.Changes = append(r.Changes, assessment.Change{Start: at, Length: length, From: km(at), To: km(at + length), Before: 80, After: 90, RunOut: runOut, Direction: "nominal", Trains: []int{0}})
		level(at, at+length, 80, 90)
		at += length
	}
	level(0, at, 100, 100)
	for range n {
		change(length, false)
		if runOut > 0 {
			change(runOut, true)
		}
		level(at, at+gap, 100, 100)
		at += gap
	}
	s.From, s.To, s.WindowTo, s.RouteLength = 2*gap, at-gap, at, at
	s.Segments = []assessment.Segment{{To: at}}
	return &assessment.Computed{Routes: []assessment.Route{r}, Trains: []assessment.Train{{ID: "T"}}}, &s
}

// Where changes are many or far apart, a stretch is cut into charts: each change
// belongs to one of them, a run-out to that of its change.
func TestPanels(t *testing.T) {
	for _, test := range []struct {
		name                string
		n                   int
		length, runOut, gap int64
		charts              int
	}{
		{"one", 1, 1e6, 0, 1e6, 1},
		{"eight", 8, 1e6, 230e3, 770e3, 1},
		{"nine", 9, 1e6, 230e3, 770e3, 2},
		{"sixty", 60, 1e6, 230e3, 770e3, 8},
		{"short and far apart", 3, 50e3, 0, 900e3, 3},
		{"short and near", 3, 50e3, 0, 150e3, 1},
		{"no track between", 20, 100e3, 0, 0, 3},
	} {
		t.Run(test.name, func(t *testing.T) {
			c, s := comb(test.n, test.length, test.runOut, test.gap)
			r := &c.Routes[0]
			list := panels(r, s)
			if len(list) != test.charts {
				t.Fatalf("%d charts, want %d", len(list), test.charts)
			}
			next := 0
			for i := range list {
				p := &list[i]
				whole := 0
				for _, k := range p.Changes {
					x := &r.Changes[k]
					if k != next {
						t.Fatalf("chart %d has change %d, want %d", i, k, next)
					}
					next++
					if !x.RunOut {
						whole++
					}
					if x.Start < p.WindowFrom || x.Start+x.Length > p.WindowTo {
						t.Errorf("chart %d does not show change %d", i, k)
					}
					for m := range list {
						if list[m].holds(x) != (m == i) {
							t.Errorf("change %d of chart %d: chart %d holds it: %v", k, i, m, m != i)
						}
					}
				}
				if whole == 0 || whole > mostPanelChanges || r.Changes[p.Changes[0]].RunOut {
					t.Errorf("chart %d has %d changes and begins with a run-out: %v", i, whole, r.Changes[p.Changes[0]].RunOut)
				}
			}
			if next != len(s.Changes) {
				t.Errorf("%d of %d changes", next, len(s.Changes))
			}
		})
	}
}

// A chart of sixty changes can be read: the legend has the numbers that are drawn
// and no others, labels keep off each other, and what has no room is counted.
func TestCrowdedChart(t *testing.T) {
	c, s := comb(60, 1e6, 230e3, 770e3)
	all := panel{Changes: s.Changes, WindowTo: s.WindowTo}
	for i, p := range append(panels(&c.Routes[0], s), all) {
		f := stretchFigure(c, s, &p)
		d := &drawing{f: f, top: 120}
		labels, unlabelled := d.placeLabels()
		cells, governs, unnumbered := d.cells()
		svg := f.svg("a")
		drawn := map[int]bool{}
		for _, x := range cells {
			if x.number > 0 {
				drawn[x.number] = true
			}
		}
		if len(drawn) != len(governs) {
			t.Errorf("chart %d: %d numbers drawn, %d in the legend", i, len(drawn), len(governs))
		}
		for k, a := range labels {
			for _, b := range labels[:k] {
				if a.row == b.row && a.x-b.x < float64(len([]rune(a.text))+len([]rune(b.text)))*6.5/2 {
					t.Errorf("chart %d: %q at %.0f and %q at %.0f", i, a.text, a.x, b.text, b.x)
				}
			}
		}
		full := len(p.Changes) == len(s.Changes)
		if said := strings.Contains(svg, "Not printed: "); said != full || (unlabelled > 0) != full || (unnumbered > 0) != full {
			t.Errorf("chart %d says that something is not printed: %v; %d labels, %d numbers", i, said, unlabelled, unnumbered)
		}
		if full && !strings.Contains(svg, fmt.Sprintf("%d steps have no room for a label", unlabelled)) {
			t.Errorf("the labels left out are not counted")
		}
	}
}

// A change of five metres has a hatch, a number and its surroundings.
func TestShortChart(t *testing.T) {
	c, s := comb(1, 5e3, 0, 600e3)
	p := &panels(&c.Routes[0], s)[0]
	d := &drawing{f: stretchFigure(c, s, p), top: 120}
	cells, _, left := d.cells()
	if len(cells) != 3 || cells[1].width < 15 || cells[1].number != 2 || left != 0 {
		t.Errorf("%+v", cells)
	}
	// In a wider window its number stands above.
	d.f.From, d.f.To = 600e3, 1805e3
	if cells, _, _ = d.cells(); !cells[1].above || cells[1].number != 2 {
		t.Errorf("%+v", cells)
	}
}

// Where the posts jump, neither reading is an ordinary tick.
func TestTickAtJump(t *testing.T) {
	f := &figure{Direction: "nominal", To: 4e6, RouteLength: 4e6, After: []level{{To: 4e6, Speed: 80}},
		Segments: []assessment.Segment{{Chainage: 19e6, From: 0, To: 1e6}, {Chainage: 21e6, From: 1e6, To: 4e6}}}
	svg := f.svg("a")
	for _, km := range []string{"20.000", "21.000"} {
		if n := strings.Count(svg, ">"+km+"<"); n != 1 {
			t.Errorf("%s stands %d times", km, n)
		}
	}
	if !strings.Contains(svg, ">22.000<") {
		t.Error("no other tick")
	}
}
