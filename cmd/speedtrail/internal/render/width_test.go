package render

import (
	"fmt"
	"slices"
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

func TestWrap(t *testing.T) {
	for _, x := range []struct {
		text  string
		width int
		want  []string
	}{
		{"", 10, nil},
		{"one two  three", 7, []string{"one two", "three"}},
		{"routes/a-long-one/speed.csv:4 basic", 10, []string{"routes/a-long-one/speed.csv:4", "basic"}},
		{"\u5317\u7ebf\u6539\u5efa\u5de5\u7a0b ab", 8, []string{"\u5317\u7ebf\u6539\u5efa", "\u5de5\u7a0b ab"}},
		{"\u5317\u7ebf, \u6539", 4, []string{"\u5317", "\u7ebf,", "\u6539"}},
		{"R1 \u5317\u7ebf\u6539", 6, []string{"R1 \u5317", "\u7ebf\u6539"}},
		{"e\u0301e\u0301 e\u0301", 4, []string{"e\u0301e\u0301 e\u0301"}},
		{"to km 5.200 (600 m) at 100 km/h, then", 12, []string{"to km 5.200", "(600 m) at", "100 km/h,", "then"}},
		{"over km and 20 minutes", 12, []string{"over km and", "20 minutes"}},
		{"\u221220 \u221230", 7, []string{"\u221220 \u221230"}},
	} {
		if got := Wrap(x.text, x.width); !slices.Equal(got, x.want) {
			t.Errorf("%q in %d columns: %q, want %q", x.text, x.width, got, x.want)
		}
	}
}

// Points stand below each other, whatever stands on their sides.
func TestOnPoint(t *testing.T) {
	got := onPoint([]string{"33.000", "\u22120.400", "41.100#1", "118.025125", "7", ""})
	want := []string{" 33.000   ", " \u22120.400   ", " 41.100#1 ", "118.025125", "  7       ", ""}
	if !slices.Equal(got, want) {
		t.Errorf("got %q, want %q", got, want)
	}
}

// Of many findings those of a route stand together, each on few lines, and the last
// line names the command that lists the rest.
func TestManyFindings(t *testing.T) {
	c := assessment.Computed{Explained: []assessment.Explanation{{ID: assessment.Outside, Why: "Why.", Do: "Do."}}}
	for i := range 90 {
		c.Findings = append(c.Findings, assessment.Finding{
			ID: assessment.Outside, Route: fmt.Sprintf("R%d", i%3), Direction: "nominal", From: fmt.Sprintf("%d.000", i), To: fmt.Sprintf("%d.500", i),
			Row: fmt.Sprintf("routes/r/speed.csv:%d", i), Text: "raised by 10 km/h: no request holds it",
		})
	}
	c.Findings[4].Accepted = "it was asked for"
	text := func(number int64) string {
		var b strings.Builder
		p := &textWriter{w: &b, d: &assessment.Document{Computed: c}, c: &c, r: Record{Number: number}, s: Style{Width: 80}}
		p.findings()
		return b.String()
	}
	got := strings.NewReplacer("\n  report.html lists", " report.html lists").Replace(text(7))
	for _, want := range []string{
		"outside (89). Why. Do. Of each: no request holds it.\n  on R0\n! nominal, km 0.000 to 0.500: raised by 10 km/h; routes/r/speed.csv:0\n! nominal, km 3.000 to 3.500",
		"\n  on R1\n", "\n  and 29 more, on R0 (9), R1 (10), R2 (10); speedtrail report 7 --out report.html lists all\n",
	} {
		if !strings.Contains(got, want) {
			t.Errorf("%q is not in\n%s", want, got)
		}
	}
	if got := text(0); !strings.Contains(got, "; --format html --out report.html\n  lists all\n") {
		t.Error(got)
	}
}

// A step and where it is fit the width, and positions stand on the decimal point.
func TestFamilyPlaces(t *testing.T) {
	at := func(from, to string) *assessment.Change { return &assessment.Change{From: from, To: to} }
	a, b := at("33.000", "34.500"), at("41.100#1", "41.380")
	c, d := at("118.025", "124.300"), at("118.350", "124.300")
	got := familyPlaces([]family{
		{from: [2]*assessment.Change{a, a}, to: [2]*assessment.Change{a, a}}, {from: [2]*assessment.Change{b, b}, to: [2]*assessment.Change{b, b}},
		{from: [2]*assessment.Change{c, d}, to: [2]*assessment.Change{c, d}}, {from: [2]*assessment.Change{a, a}, to: [2]*assessment.Change{a, c}},
	})
	want := []string{
		"km             33.000   to  34.500           ",
		"km             41.100#1 to  41.380           ",
		"km 118.025 .. 118.350   to 124.300           ",
		"km             33.000   to  34.500 .. 124.300",
	}
	if !slices.Equal(got, want) {
		t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(want, "\n"))
	}
}

func TestClip(t *testing.T) {
	for _, x := range []struct{ text, want string }{
		{"short", "short"}, {"seven letters", "seven\u2026"}, {"\u5317\u7ebf\u6539", "\u5317\u7ebf\u6539"}, {"\u5317\u7ebf\u6539\u5efa", "\u5317\u7ebf\u2026"},
	} {
		if got := clip(x.text, 6); got != x.want {
			t.Errorf("%q: got %q, want %q", x.text, got, x.want)
		}
	}
}

// Below a chart stand both ends, both readings of jumps, and round kilometres between
// them, none over another.
func TestAxis(t *testing.T) {
	p := Profile{
		Pieces:   []Piece{{From: "-0.400", To: "12.000", End: 11_900_000}},
		Segments: []assessment.Segment{{Chainage: -400_000, From: 0, To: 4_600_000}, {Chainage: 4_500_000, From: 4_600_000, To: 12_100_000}},
	}
	line, labels := axis(p, 72)
	if want := "  km  \u22120.400        2.000        4.200|4.500           8.000            12.000"; labels != want {
		t.Errorf("labels\n%s, want\n%s", labels, want)
	}
	if want := "\u2500\u2500\u2500\u2500\u2500\u2500\u2500\u2500\u2500\u2500\u2500\u2500\u2500\u2500\u252c"; !strings.HasPrefix(line, want) || strings.Count(line, "\u252c") != 2 || strings.Count(line, "\u253c") != 1 || Cells(line) != 72 {
		t.Errorf("line %s", line)
	}
}
