package doubt

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"speedtrail/diff/fleet"
	"speedtrail/diff/impact"
	"speedtrail/diff/profile"
	"speedtrail/diff/step"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// delays looks at missing train length delays.
func (c *check) delays() {
	for i := range c.route.Places {
		if bridge := &c.route.Places[i]; bridge.Kind == schema.Bridge {
			c.overBridge(bridge)
		}
	}
	c.oneSided()
}

// overBridge looks at what lets go of a train for its front while its rear can still
// be on a bridge.
func (c *check) overBridge(bridge *schema.PlaceRow) {
	longest, end := c.longest(), max(bridge.End, bridge.Start+1)
	// near gives the directions in which the rear of the longest train can
	// still be on the bridge when its front leaves the row.
	near := func(row *schema.Row) (set codes.Directions) {
		if row.Directions.Has(codes.Nominal) && row.End-bridge.End < longest {
			set |= codes.OnlyNominal
		}
		if row.Directions.Has(codes.Reverse) && bridge.Start-row.Start < longest {
			set |= codes.OnlyReverse
		}
		return set & c.route.Directions
	}
	structure := func(row *schema.Row, what string) {
		over := !row.Delay && row.Start < end && bridge.Start < row.End
		if set := near(row); over && set != 0 {
			c.list = append(c.list, Doubt{ID: DelayOverBridge, Directions: set, From: row.Start, To: row.End, Row: row.Pos, Text: fmt.Sprintf(
				"%s over %s ends for the front of a train whose rear can still be on the bridge", what, bridge.Name)})
		}
	}
	for k := range c.route.AxleLoad {
		structure(&c.route.AxleLoad[k].Row, "the axle load restriction")
	}
	for k := range c.route.Temporary {
		structure(&c.route.Temporary[k].Row, c.route.Temporary[k].ID)
	}
	for row := range c.speeds.on(bridge.Start, end) {
		if row.Delay {
			continue
		}
		for _, d := range codes.AllDirections {
			if near(&row.Row).Has(d) && c.risesAfter(row, d) > 0 {
				c.list = append(c.list, Doubt{ID: DelayOverBridge, Directions: 1 << d, From: row.Start, To: row.End, Row: row.Pos, Text: fmt.Sprintf(
					"the speed rises for the front of a train whose rear can still be on %s", bridge.Name)})
			}
		}
	}
}

// oneSided looks for rows of speed.csv that hold a train until its rear has left in one
// direction and not in the other.
func (c *check) oneSided() {
	// The rows of a direction cover its track once: two rows of one place are for
	// different directions.
	for i := range c.route.Speed {
		a := &c.route.Speed[i]
		for b := range c.speeds.on(a.Start, a.Start+1) {
			if a.Delay || !b.Delay || a.Start != b.Start || a.End != b.End {
				continue
			}
			for _, d := range codes.AllDirections {
				if a.Directions == 1<<d && c.risesAfter(a, d) > 0 && c.risesAfter(b, 1-d) > 0 {
					c.list = append(c.list, named(Doubt{ID: DelayOneSided, Directions: 1 << d & c.route.Directions, From: a.Start, To: a.End, Row: a.Pos, Text: fmt.Sprintf(
						"the speed rises at the end of this stretch without train length delay in direction %s; in direction %s (%s) it waits for the rear", d, 1-d, other)},
						fmt.Sprintf("line %d", b.Pos.Line)))
				}
			}
		}
	}
}

// risesAfter gives by how much the basic speed, or that of any category, rises
// where a train leaves a row in a direction of travel. The rows of a direction cover
// its track once: the one behind begins where this one ends.
func (c *check) risesAfter(row *schema.SpeedRow, d codes.Direction) (rise unit.Speed) {
	at := row.End
	if d == codes.Reverse {
		at = row.Start - 1
	}
	for next := range c.speeds.on(at, at+1) {
		if !next.Directions.Has(d) {
			continue
		}
		for _, t := range c.trains {
			class := profile.ClassOf(t)
			rise = max(rise, profile.StaticSpeedOf(next, class)-profile.StaticSpeedOf(row, class))
		}
		rise = max(rise, next.Basic-row.Basic)
	}
	return rise
}

// seenBy is a doubtful piece of a profile and who meets it, by direction of travel.
type seenBy struct {
	id       string
	from, to unit.Distance
	text     string
	rows     [2]source.Position
	trains   [2][]string
}

// doubts gives one doubt for both directions if the same trains meet it in both.
func (s *seenBy) doubts() []Doubt {
	doubt := func(set codes.Directions, d codes.Direction) Doubt {
		return Doubt{ID: s.id, Directions: set, From: s.from, To: s.to, Row: s.rows[d], Text: s.text + " (" + strings.Join(s.trains[d], ", ") + ")"}
	}
	if slices.Equal(s.trains[0], s.trains[1]) {
		return []Doubt{doubt(codes.Both, codes.Nominal)}
	}
	var list []Doubt
	for _, d := range codes.AllDirections {
		if len(s.trains[d]) > 0 {
			list = append(list, doubt(1<<d, d))
		}
	}
	return list
}

// steps looks at the permanent line speeds of the reference trains, without
// their length: at large steps, and at short stretches between others.
func (c *check) steps() {
	if c.limits.LargestStep == 0 && c.limits.ShortestStretch == 0 {
		return
	}
	type key struct {
		from, to unit.Distance
		text     string
	}
	var list []*seenBy
	known := map[key]*seenBy{}
	note := func(id string, from, to unit.Distance, text string, row source.Position, d codes.Direction, train string) {
		k := key{from, to, text}
		x, ok := known[k]
		if !ok {
			x = &seenBy{id: id, from: from, to: to, text: text}
			known[k] = x
			list = append(list, x)
		}
		if len(x.trains[d]) == 0 {
			x.rows[d] = row
		}
		if !slices.Contains(x.trains[d], train) {
			x.trains[d] = append(x.trains[d], train)
		}
	}
	for _, d := range codes.AllDirections {
		if !c.route.Directions.Has(d) {
			continue
		}
		compiler := profile.New(c.route, d, profile.NoTemporary)
		for _, t := range c.trains {
			t.Length = 0
			pieces := compiler.Profile(t)
			for i, p := range pieces {
				if i > 0 {
					low, high := pieces[i-1], p
					if low.Speed > high.Speed {
						low, high = high, low
					}
					if limit := c.limits.LargestStep; limit > 0 && high.Speed-low.Speed > limit {
						note(StepSize, p.From, p.From, fmt.Sprintf("%d and %d km/h meet, a step of more than %d km/h", pieces[i-1].Speed, p.Speed, limit), c.rowAt(low, d), d, t.ID)
					}
				}
				if limit := c.limits.ShortestStretch; i > 0 && i < len(pieces)-1 && p.To-p.From < limit {
					note(ShortStretch, p.From, p.To, fmt.Sprintf("%d km/h holds for %s m only, below the %s m of dataset.toml", p.Speed, (p.To-p.From).M(), limit.M()), c.rowAt(p, d), d, t.ID)
				}
			}
		}
	}
	for _, s := range list {
		c.list = append(c.list, s.doubts()...)
	}
}

// rowAt gives the row that a piece of a profile is known by: the first that
// governs, or where the train's own maximum speed does, the row of speed.csv.
func (c *check) rowAt(p profile.Governed, d codes.Direction) source.Position {
	if p.Sources[0].Layer != profile.TrainSpeed {
		return p.Sources[0].Pos
	}
	for i := range c.route.Speed {
		if row := &c.route.Speed[i]; row.Directions.Has(d) && row.Start <= p.From && p.From < row.End {
			return row.Pos
		}
	}
	return p.Sources[0].Pos
}

// crossings looks for approaches that are shorter than their warning time for
// the fastest train that the standard can describe.
func (c *check) crossings() {
	for _, d := range codes.AllDirections {
		if !c.route.Directions.Has(d) {
			continue
		}
		var fastest []step.Func // of every kind of train
		for i := range c.route.Places {
			p := &c.route.Places[i]
			from, to, ok := impact.Approach(p, d, c.route.Track.Length())
			if !ok || p.WarningDS == 0 {
				continue
			}
			if fastest == nil {
				compiler := profile.New(c.route, d, profile.NoTemporary)
				for _, sel := range fleet.Selections(compiler) {
					fastest = append(fastest, compiler.Sweep(sel, 0, profile.NoMaximum))
				}
			}
			least := int64(math.MaxInt64)
			for _, f := range fastest {
				least = min(least, impact.ApproachTenths(f, from, to))
			}
			if least < int64(p.WarningDS) {
				c.list = append(c.list, Doubt{ID: CrossingWarning, Directions: 1 << d, From: p.Start, To: p.End, Row: p.Pos, Text: fmt.Sprintf(
					"the fastest train that the rows admit, without temporary restrictions, is at %s %s s after its strike-in point; the crossing needs %s s",
					p.Name, tenths(least), tenths(int64(p.WarningDS)))})
			}
		}
	}
}

func tenths(n int64) string { return fmt.Sprintf("%d.%d", n/10, n%10) }
