package render

import (
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// The table of the trains fits the terminal, also where a train has no change of speed
// and another one of its running time alone.
func TestTrainsFit(t *testing.T) {
	d := pageDocument("R1")
	c := &d.Computed
	c.Trains[0].ID = "EXPRESS"
	c.Trains = append(c.Trains, assessment.Train{ID: "ORE-TRAIN-9", Fate: "added", After: &assessment.Definition{}}, assessment.Train{ID: "T", Fate: "kept", After: &assessment.Definition{}})
	c.Figures.Runs = []assessment.RunFigure{{Route: "R1", Direction: "nominal", Train: "T", Before: 4001, After: 4073}}
	var b strings.Builder
	p := &textWriter{w: &b, d: d, c: c, s: Style{Width: 80}}
	p.trains()
	for line := range strings.Lines(b.String()) {
		if n := Cells(strings.TrimRight(line, "\n")); n > 80 {
			t.Errorf("%d columns: %s", n, line)
		}
	}
	for _, words := range []string{"(added)", "  no change of\n", "  speed\n", "running time\n", "only: R1\n"} {
		if !strings.Contains(b.String(), words) {
			t.Errorf("%q is missing:\n%s", words, b.String())
		}
	}
}

// Tables fit a narrow terminal, the units below the names of their columns; a command
// stands on a line of its own there.
func TestNarrowTables(t *testing.T) {
	d := pageDocument("NORTH-EASTERN-1")
	c := &d.Computed
	c.Trains = []assessment.Train{{ID: "REGIONAL-EXPRESS", Fate: "removed", Raised: 603_642_000, Lowered: 597_980_500, LargestRaise: 120, LargestReduction: 120, Routes: []string{"NORTH-EASTERN-1"}, After: &assessment.Definition{}}}
	c.Figures.Runs = []assessment.RunFigure{{Route: "NORTH-EASTERN-1", Direction: "nominal", Train: "REGIONAL-EXPRESS", Before: 40_001, After: 4_073}}
	for _, width := range []int{60, 80, 120} {
		var b strings.Builder
		if err := Text(&b, d, Record{}, Style{Width: width}); err != nil {
			t.Fatal(err)
		}
		for line := range strings.Lines(b.String()) {
			if n := Cells(strings.TrimRight(line, "\n")); n > width && !strings.HasPrefix(line, "  speedtrail ") {
				t.Errorf("%d of %d columns: %s", n, width, line)
			}
		}
		narrow := width == 60
		if strings.Contains(b.String(), "raised km") == narrow || strings.Contains(b.String(), "one train:\n") != (width < 120) {
			t.Errorf("with %d columns:\n%s", width, b.String())
		}
	}
}

// Hundreds of routes that a train sees a change on are counted, and a few are named.
func TestTrainRoutesAreFew(t *testing.T) {
	routes := strings.Split("R01 R02 R03 R04 R05 R06 R07 R08 R09 R10 R11", " ")
	for n, want := range map[int]string{
		1: "R01", 9: "R01, R02, R03, R04, R05, R06, R07, R08, R09",
		10: "10 routes", 11: "11 routes",
	} {
		c := &assessment.Computed{Trains: []assessment.Train{{ID: "T", Routes: routes[:n]}}}
		if got := trainRoutes(c)["T"]; got != want {
			t.Errorf("%d routes: %s, want %s", n, got, want)
		}
	}
}

// Running times over track that differs are not shown as gained or lost.
func TestOtherLengths(t *testing.T) {
	route := func(id string, track int) assessment.Route {
		return assessment.Route{ID: id, Track: make([]assessment.TrackPiece, track)}
	}
	c := &assessment.Computed{Routes: []assessment.Route{route("S4", 2), route("S5", 2), route("S6", 0)}}
	if got := otherLengths(c); got != "" {
		t.Errorf("without times: %q", got)
	}
	c.Figures.Runs = []assessment.RunFigure{{Route: "S4"}, {Route: "S4"}, {Route: "S6"}}
	want := " The track differs on S4: times before and after are not over the same track there."
	if got := otherLengths(c); got != want {
		t.Errorf("got %q, want %q", got, want)
	}
	for name, words := range map[string]string{"figures": motionWords(c), "trains": func() string {
		var b strings.Builder
		(&textWriter{w: &b, d: &assessment.Document{}, c: c, s: Style{Width: 400}}).trains()
		return b.String()
	}()} {
		if !strings.Contains(words, want) {
			t.Errorf("%s: %s", name, words)
		}
	}
}
