package render

import (
	"speedtrail/diff"
	"speedtrail/history/assessment"
)

// movesDates tells whether a difference alters when temporary restrictions hold, and
// nothing else. All of them count in a comparison, whatever their dates: no speed
// differs in it, and on the track one that ends earlier lets trains go faster.
func movesDates(d *assessment.RowDiff) bool {
	return d.Effect == "none" && (d.Reason == diff.OnlyValidity.String() || d.Reason == diff.OtherZone.String())
}

// datesSentence says in how many rows; empty for none.
func datesSentence(c *assessment.Computed) string {
	n, zone := 0, false
	for i := range c.Source {
		for k := range c.Source[i].Rows {
			if d := &c.Source[i].Rows[k]; movesDates(d) {
				n++
				zone = zone || d.Reason == diff.OtherZone.String()
			}
		}
	}
	switch {
	case zone && n == 1:
		return "The time zone differs in which temporary restrictions are dated: each without a zone of its own begins and ends at another time."
	case zone:
		return "The time zone differs in which temporary restrictions are dated, and " + plural(n-1, "row alters", "rows alter") + " when one holds."
	case n > 0:
		return plural(n, "row alters", "rows alter") + " when a temporary restriction holds."
	}
	return ""
}

// rowsOfDates lists the rows that do so, with their places, for somebody who is about
// to sign.
func rowsOfDates(c *assessment.Computed) (list []string) {
	for i := range c.Source {
		f := &c.Source[i]
		for k := range f.Rows {
			if d := &f.Rows[k]; movesDates(d) {
				list = append(list, fileName(*f)+":"+rowLines(d)+" "+rowWords(f, d))
			}
		}
	}
	return list
}
