package schema

import (
	"regexp"
	"sync"
	"time"

	"speedtrail/schema/source"
	"speedtrail/schema/table"
)

// implausible is what is wrong with a date that is not plausible: years outside
// these are slips of the pen.
const implausible = "lies outside the years 1900 to 9999"

func plausible(t time.Time) bool { return t.Year() >= 1900 && t.Year() <= 9999 }

// dateTimeForm is RFC 3339 where time.Parse is laxer: two digits for the hour,
// a point before the fraction, an offset below a day.
var dateTimeForm = sync.OnceValue(func() *regexp.Regexp {
	return regexp.MustCompile(`^[0-9]{4}-[0-9]{2}-[0-9]{2}T[0-9]{2}:[0-9]{2}:[0-9]{2}(\.[0-9]+)?(Z|[+-]([01][0-9]|2[0-3]):[0-5][0-9])$`)
})

// instant reads a date, whole days as the time zone has them, or a date-time.
func (r *reader) instant(c table.Cell, column string, until bool) time.Time {
	if c.Text == "" {
		return time.Time{}
	}
	t, err := time.Parse(time.DateOnly, c.Text)
	day := err == nil
	if !day && dateTimeForm().MatchString(c.Text) {
		t, err = time.Parse(time.RFC3339, c.Text)
	}
	switch {
	case err != nil:
		r.faults.Add(c.Pos, "%s %s is no date (2026-03-01) or date-time (2026-03-01T06:00:00Z)", column, source.Quote(c.Text))
		return time.Time{}
	case !plausible(t):
		r.faults.Add(c.Pos, "%s %s "+implausible, column, source.Quote(c.Text))
		return time.Time{}
	case day && until:
		_, t = Day(t, r.zone)
	case day:
		t, _ = Day(t, r.zone)
	}
	return t
}

// Day gives the instants between which the clocks of a zone show a day, or would:
// from <= t < until. The day is given by its midnight in UTC. A day that the clocks
// pass over is empty.
func Day(day time.Time, zone *time.Location) (from, until time.Time) {
	return firstInstant(day, zone), firstInstant(day.AddDate(0, 0, 1), zone)
}

// firstInstant gives the first instant at which a zone's clocks show a day,
// given by its midnight in UTC, or a later one. That is not always midnight:
// clocks may go forward over it, or even over the whole day.
func firstInstant(day time.Time, zone *time.Location) time.Time {
	// No zone is two days from UTC. From there on, one offset after the other.
	t := day.AddDate(0, 0, -2).In(zone)
	for {
		_, offset := t.Zone()
		midnight := day.Add(-time.Duration(offset) * time.Second)
		_, end := t.ZoneBounds()
		switch {
		case !end.IsZero() && !midnight.Before(end):
			t = end
		case midnight.Before(t):
			return t // the clocks went forward over it
		default:
			return midnight.In(zone)
		}
	}
}
