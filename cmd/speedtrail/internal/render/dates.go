package render

import (
	"cmp"
	"path"
	"slices"

	"speedtrail/diff"
	"speedtrail/history/assessment"
)

// movesDates tells whether a difference alters when temporary restrictions hold, of
// which the changes of speed say nothing. All of them count in a comparison, whatever
// their dates: what ends earlier differs in none, and on the track it lets trains go
// faster. So does a row that is cut in two of which one ends, or one that is gone beside
// another which will end; and a row of new dates can have another length as well.
func movesDates(f *assessment.SourceFile, d *assessment.RowDiff) bool {
	switch {
	case d.Reason == diff.OtherZone.String():
		return true
	case path.Base(cmp.Or(f.Target, f.Base)) != "temporary.csv" || d.Reason == diff.SameValue.String() || d.Reason == diff.OnlyText.String():
		return false
	case d.Effect == "none":
		return true
	}
	return d.Kind != "added" && d.Kind != "removed" &&
		slices.ContainsFunc(d.Cells, func(c assessment.CellDiff) bool { return c.Column == "valid_from" || c.Column == "valid_to" })
}

// datesSentence says in how many rows; empty for none.
func datesSentence(c *assessment.Computed) string {
	n, zone := 0, false
	for i := range c.Source {
		f := &c.Source[i]
		for k := range f.Rows {
			if d := &f.Rows[k]; movesDates(f, d) {
				n++
				zone = zone || d.Reason == diff.OtherZone.String()
			}
		}
	}
	switch {
	case zone && n == 1:
		return "The time zone differs in which temporary restrictions are dated: each without a zone of its own begins and ends at another time."
	case zone:
		return "The time zone differs in which temporary restrictions are dated, and " + plural(n-1, "row makes", "rows make") + " one hold at other times."
	case n > 0:
		return plural(n, "row makes a temporary restriction", "rows make temporary restrictions") + " hold at other times."
	}
	return ""
}

// rowsOfDates lists the rows that do so, with their places, for somebody who is about
// to sign.
func rowsOfDates(c *assessment.Computed) (list []string) {
	for i := range c.Source {
		f := &c.Source[i]
		for k := range f.Rows {
			if d := &f.Rows[k]; movesDates(f, d) {
				list = append(list, fileName(*f)+":"+rowLines(d)+" "+rowWords(f, d))
			}
		}
	}
	return list
}
