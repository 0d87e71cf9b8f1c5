package assessment

import (
	"fmt"
	"time"

	"speedtrail/diff"
	"speedtrail/schema"
)

// dated says where temporary restrictions hold at other times and no speed of the
// comparison shows it.
func (c *collector) dated(r *diff.Route) {
	for _, x := range r.Dated {
		what := "slower at some time"
		switch {
		case x.Faster && x.Slower:
			what = "faster at some time and slower at another"
		case x.Faster:
			what = "faster at some time"
		}
		past := ""
		if !x.Until.IsZero() && !x.Until.After(c.in.At) {
			// It counts all the same: who dates the target ahead makes a past of anything.
			past = "; none of it after " + x.Until.UTC().Format(time.RFC3339) + ", before the time of the target"
		}
		of := ""
		if x.OfBase {
			of = " of the base"
		}
		c.add(ranked{raised: x.Faster, Finding: Finding{
			ID: DatesChanged, Route: r.ID, Direction: x.Direction.String(), Row: rowText(&x.Row.Row),
			From: r.Target.Track.Begins(x.From).String(), To: r.Target.Track.Ends(x.To).String(),
			Text: fmt.Sprintf("trains are %s by the dates of temporary restrictions: see %s%s, %d km/h, %s", what, x.Row.ID, of, x.Row.Speed, validityWords(x.Row.Valid)) + past,
		}})
	}
}

// zone says that another time zone moves all dates without a zone of their own, those
// of routes that are the same on both sides included.
func (c *collector) zone() {
	before, after := c.in.Base.TimeZone.String(), c.in.Target.TimeZone.String()
	if before != after {
		c.add(ranked{Finding: Finding{ID: DatesChanged, Text: fmt.Sprintf(
			"the time zone is %s, it was %s: every temporary restriction that is dated by days without a zone begins and ends at another time, on all routes", after, before)}})
	}
}

func validityWords(v schema.Validity) string {
	switch {
	case v.WrittenFrom != "" && v.WrittenTo != "":
		return "valid from " + v.WrittenFrom + " to " + v.WrittenTo
	case v.WrittenFrom != "":
		return "valid from " + v.WrittenFrom + " on"
	case v.WrittenTo != "":
		return "valid to " + v.WrittenTo
	}
	return "always valid"
}
