package assessment

import (
	"reflect"
	"slices"
	"time"

	"speedtrail/diff/doubt"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// inBase tells whether an entry of accepted.toml stands in the base, unaltered.
func (c *collector) inBase(a schema.Acceptance) bool {
	return slices.ContainsFunc(c.in.Base.Accepted, func(b schema.Acceptance) bool {
		a.Pos, b.Pos = source.Position{}, source.Position{}
		a.Places, b.Places = schema.Places{}, schema.Places{}
		return reflect.DeepEqual(a, b)
	})
}

// accept marks the findings that an entry of accepted.toml covers, and lists the
// entries of the target.
func (c *collector) accept() []Acceptance {
	today := c.in.At.In(c.in.Target.TimeZone).Format(time.DateOnly)
	list := []Acceptance{}
	for _, a := range c.in.Target.Accepted {
		doc := Acceptance{
			Finding: a.Finding, Route: a.Route, From: a.Span.From.String(), To: a.Span.To.String(), Reason: a.Reason, Until: a.Until, Line: a.Pos.Line,
		}
		var route *schema.Route
		for _, r := range c.in.Account.Routes {
			if r.ID == a.Route {
				route = r.Target
			}
		}
		switch {
		case !slices.Contains(doubt.IDs, a.Finding):
			doc.State = "never"
		case route == nil:
			doc.State = "unread"
		case !c.inBase(a):
			doc.State = "new"
		case a.Until != "" && a.Until < today:
			doc.State = "over"
		default:
			doc.Covers = c.cover(a, route.Track)
			doc.State = "unused"
			if doc.Covers > 0 {
				doc.State = "used"
			}
		}
		list = append(list, doc)
	}
	return list
}

// cover marks the findings that lie wholly inside an entry.
func (c *collector) cover(a schema.Acceptance, t *chainage.Track) (n int) {
	from, err := t.Find(a.Span.From)
	if err != nil {
		return 0
	}
	to, err := t.Find(a.Span.To)
	if err != nil {
		return 0
	}
	for i := range c.list {
		f := &c.list[i]
		if f.ID != a.Finding || f.Route != a.Route {
			continue
		}
		start, errA := written(t, f.From)
		end, errB := written(t, f.To)
		if errA == nil && errB == nil && from <= start && end <= to {
			f.Accepted = a.Reason
			n++
		}
	}
	return n
}

// written locates a position that was written for this track.
func written(t *chainage.Track, km string) (unit.Distance, error) {
	p, err := chainage.ParsePoint(km)
	if err != nil {
		return 0, err
	}
	return t.Locate(p)
}
