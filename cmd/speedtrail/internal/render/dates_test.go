package render

import (
	"bytes"
	"strings"
	"testing"

	"speedtrail/diff"
	"speedtrail/history/assessment"
)

// A restriction that ends earlier alters no speed of a comparison, and lets trains go
// faster: whoever reads the verdict or is about to sign is told.
func TestOtherDates(t *testing.T) {
	row := func(column, before, after string, reason diff.Reason) assessment.RowDiff {
		return assessment.RowDiff{Kind: "altered", Effect: "none", Reason: reason.String(), BaseLines: []int{2}, TargetLines: []int{2},
			Cells: []assessment.CellDiff{{Column: column, Before: before, After: after, BaseLine: 2, TargetLine: 2}}}
	}
	dates := row("valid_to", "", "2026-03-02", diff.OnlyValidity)
	zone := row("time_zone", `"UTC"`, `"Asia/Tokyo"`, diff.OtherZone)
	note := row("note", "a", "b", diff.OnlyText)
	cut := row("valid_to", "", "2026-03-02", diff.SameForAll)
	longer := row("valid_to", "", "2026-03-02", diff.NoReason)
	longer.Effect = "hidden"
	shorter := row("to_km", "4", "3", diff.NoReason)
	shorter.Effect = "hidden"
	gone := row("speed", "60", "", diff.LowerElsewhere)
	for _, c := range []struct {
		name    string
		rows    []assessment.RowDiff
		verdict string // the sentence
		listed  []string
	}{
		{"a note", []assessment.RowDiff{note}, "", nil},
		{"dates", []assessment.RowDiff{note, dates}, "1 row makes a temporary restriction hold at other times.", []string{"2 altered: valid_to blank now 2026-03-02"}},
		{"dates of two", []assessment.RowDiff{dates, dates}, "2 rows make temporary restrictions hold at other times.", []string{"valid_to blank now 2026-03-02"}},
		{"a row cut in two of which one ends", []assessment.RowDiff{cut}, "1 row makes a temporary restriction hold at other times.", []string{"valid_to blank now 2026-03-02"}},
		{"a row of another length as well", []assessment.RowDiff{longer}, "1 row makes a temporary restriction hold at other times.", []string{"valid_to blank now 2026-03-02"}},
		{"a row of another length", []assessment.RowDiff{shorter}, "", nil},
		{"a row beside another", []assessment.RowDiff{gone}, "1 row makes a temporary restriction hold at other times.", []string{"speed 60 now blank"}},
		{"the zone", []assessment.RowDiff{zone}, "The time zone differs in which temporary restrictions are dated: each without", []string{`time_zone "UTC" now "Asia/Tokyo"`}},
		{"both", []assessment.RowDiff{zone, dates}, "The time zone differs in which temporary restrictions are dated, and 1 row makes one hold at other times.", []string{"time_zone", "valid_to"}},
	} {
		d := &assessment.Document{Computed: assessment.Computed{Folder: ".", Trains: []assessment.Train{{ID: "T", Fate: "kept"}}, EqualRoutes: 1, Source: []assessment.SourceFile{{Base: "routes/r/temporary.csv", Target: "routes/r/temporary.csv", Rows: c.rows}}}}
		if v := Verdict(d); !strings.Contains(v, c.verdict) || c.verdict == "" && strings.Contains(v, "restriction") {
			t.Errorf("%s: %s", c.name, v)
		}
		var before, text bytes.Buffer
		if err := BeforeSigning(&before, d, Record{}, Style{Width: 200, Brief: true}); err != nil {
			t.Fatal(err)
		}
		if err := Text(&text, d, Record{}, Style{Width: 200}); err != nil {
			t.Fatal(err)
		}
		for _, want := range c.listed {
			if !strings.Contains(before.String(), "! other dates: ") || !strings.Contains(before.String(), want) || !strings.Contains(text.String(), want) {
				t.Errorf("%s: no %q before signing:\n%s\nor in the text report:\n%s", c.name, want, before.String(), text.String())
			}
		}
		if c.listed == nil && strings.Contains(before.String(), "other dates") {
			t.Errorf("%s:\n%s", c.name, before.String())
		}
	}
}
