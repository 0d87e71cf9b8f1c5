package render

import (
	"strings"
	"testing"

	"speedtrail/diff"
	"speedtrail/history/assessment"
)

// Where kinds of trains see a change, in words: run-out says where it begins unless it
// continues the piece before it, and lengths are left out only where the shortest and
// the longest train see the same.
func TestWhereWords(t *testing.T) {
	piece := func(from, to string, runOut bool, lengths ...int64) *assessment.FleetChange {
		return &assessment.FleetChange{From: from, To: to, RunOut: runOut, Lengths: lengths}
	}
	const short, long = 100_000, 400_000
	for _, x := range []struct {
		name, direction, want string
		pieces                []*assessment.FleetChange
	}{
		{"run-out that continues", "nominal", "km 9.000 to 10.000; run-out to km 10.300", []*assessment.FleetChange{
			piece("9.000", "10.000", false, short, long), piece("10.000", "10.300", true, short, long)}},
		{"run-out behind a gap", "nominal", "km 9.000 to 10.000; run-out to km 10.300; run-out km 10.350 to 10.700", []*assessment.FleetChange{
			piece("9.000", "10.000", false, short, long), piece("10.000", "10.300", true, short, long), piece("10.350", "10.700", true, short, long)}},
		{"run-out alone", "nominal", "run-out km 10.350 to 10.700", []*assessment.FleetChange{piece("10.350", "10.700", true, short, long)}},
		{"run-out of each length", "nominal", "km 1.000 to 2.000; run-out to km 2.100 (100 m long); run-out to km 2.400 (400 m long)", []*assessment.FleetChange{
			piece("1.000", "2.000", false, short, long), piece("2.000", "2.100", true, short), piece("2.000", "2.400", true, long)}},
		{"reverse", "reverse", "km 1.000 to 2.000; run-out to km 0.600 (400 m long); run-out to km 0.900 (100 m long); run-out km 3.000 to 3.100", []*assessment.FleetChange{
			piece("0.600", "1.000", true, long), piece("0.900", "1.000", true, short), piece("1.000", "2.000", false, short, long), piece("3.000", "3.100", true, short, long)}},
		{"pieces of two lengths that end together", "nominal", "km 1.000 to 2.000 (100 m long); km 1.300 to 2.000 (400 m long); run-out to km 2.100 (100 m long)", []*assessment.FleetChange{
			piece("1.000", "2.000", false, short), piece("1.300", "2.000", false, long), piece("2.000", "2.100", true, short)}},
		{"lengths between", "nominal", "km 1.000 to 2.000 (150, 200 m long); km 3.000 to 4.000 (100, 200 m long); km 5.000 to 6.000", []*assessment.FleetChange{
			piece("1.000", "2.000", false, 150_000, 200_000), piece("3.000", "4.000", false, short, 200_000), piece("5.000", "6.000", false, short, 200_000, long)}},
	} {
		t.Run(x.name, func(t *testing.T) {
			f := &assessment.Fleet{Direction: x.direction, Shortest: short, Longest: long}
			if got := whereWords(f, x.pieces); got != x.want {
				t.Errorf("got  %s\nwant %s", got, x.want)
			}
		})
	}
}

// A row from which only trains see a change that no reference train stands for is not
// counted among those without an effect.
func TestRowForOthers(t *testing.T) {
	for reason, want := range map[string]string{
		diff.OnlyText.String():       "no speed changes: only a text differs",
		diff.NoSuchTrain.String():    "no reference train changes, others may: no reference train is of a category that it concerns",
		diff.LowerElsewhere.String(): "no reference train changes, others may: another restriction is as low or lower for every reference train that it concerns",
	} {
		d := assessment.RowDiff{Effect: "none", Reason: reason}
		c := &assessment.Computed{Source: []assessment.SourceFile{{Rows: []assessment.RowDiff{d}}}}
		if got := effectWords(c, &d, nil); got != want {
			t.Errorf("got %q, want %q", got, want)
		}
		var b strings.Builder
		p := &textWriter{w: &b, d: &assessment.Document{Computed: *c}, c: c, s: Style{Width: 200}}
		p.sources()
		if shown := strings.Contains(b.String(), "effect: "+want); shown != holdsForOthers(&d) {
			t.Errorf("%s:\n%s", reason, b.String())
		}
	}
}
