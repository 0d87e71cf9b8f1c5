package diff

import (
	"cmp"
	"context"
	"math"
	"slices"
	"sort"

	"speedtrail/diff/align"
	"speedtrail/diff/delta"
	"speedtrail/diff/fleet"
	"speedtrail/diff/impact"
	"speedtrail/diff/profile"
	"speedtrail/diff/step"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Figures are what goes with the changes of a route: aids for the reader, by
// the formulas of package impact.
type Figures struct {
	Runs      []RunTime  // of the trains that change, or run longer or shorter, and whose data allow it
	Crossings []Crossing // whose approach time changes
	Curves    []Curve    // on which the highest speed of a train, or the curve itself, changes
	Short     []ShortRaise
}

// RunTime is the running time of a train over the whole route.
type RunTime struct {
	Direction     codes.Direction
	Train         int
	Before, After int64 // tenths of a second
	// Parts say where the difference comes from; their gains add up to Before -
	// After exactly. None where the tracks of the revisions differ.
	Parts []Part
}

// Part is a stretch of the target's track and the time gained on it, in tenths
// of a second, below zero for time lost.
type Part struct {
	From, To unit.Distance
	Gain     int64
}

// Crossing is the approach to a level crossing by the fastest train that the
// standard can describe, without length and maximum speed.
type Crossing struct {
	Direction codes.Direction
	Place     *schema.PlaceRow // of the target
	Old       *schema.PlaceRow // of the base in the same place; nil where it has none
	// Permanent: without temporary restrictions. Given where it is another time.
	Permanent bool
	// In tenths of a second, rounded down. Before is that of the base's own strike-in;
	// where the base has no crossing here, over the same stretch, and -1 where it has
	// neither.
	Before, After int64
}

// Curve is the cant deficiency on a curve for the trains of equal speeds and
// category.
type Curve struct {
	Direction     codes.Direction
	Row           *schema.CurveRow // of the target
	Old           *schema.CurveRow // of the base at the same place; nil where it has none
	Trains        []int
	Category      codes.CantDeficiency
	Before, After unit.Speed // the highest in the curve; Before 0 where the base's track differs here
	// Lowest is the lowest speed after the change in the curve of any reference
	// train, for the cant excess, and Slowest that train.
	Lowest  unit.Speed
	Slowest int
}

// ShortRaise is a raise that a train cannot use in full: it must brake again
// before it has reached the new speed.
type ShortRaise struct {
	Direction codes.Direction
	Train     int
	From, To  unit.Distance // of the piece of the profile after the change
	Speed     unit.Speed    // after the change
	Reached   unit.Speed    // whole km/h, rounded down
	Needed    unit.Distance // the length of piece at which it would just be reached
}

// figures computes the figures of one direction of travel. The context ends it
// between two trains.
func (p *pair) figures(ctx context.Context, trains []Train, rolling bool) error {
	f := &p.route.Figures
	var w runs
	for i, t := range trains {
		if err := ctx.Err(); err != nil {
			return err
		}
		m := impact.Motion{Acceleration: t.Acceleration, Braking: t.Braking, Rolling: rolling}
		// Where the track is another one, a train without a change of speed takes another
		// time, too.
		if s := p.sights[i]; m.Given() && (len(s.changes) > 0 || !p.same) {
			p.running(f, i, t, s.changes, m, &w)
		}
	}
	p.crossings(f)
	p.curves(f, trains)
	return nil
}

// runs is memory for two runs, used again for each train.
type runs struct {
	base, target, near step.Func
	turned             [2]step.Func // base and target in the order of travel
	before, after      impact.Run
}

// compute compiles both sides for a train and computes the runs along them.
func (w *runs) compute(p *pair, t Train, m impact.Motion) {
	class := profile.ClassOf(t.Train)
	w.base = p.whole[0].AppendSweep(w.base[:0], p.whole[0].Select(class), t.Length, t.Max)
	if p.same {
		// Outside the cells both sides are the same.
		w.near = p.all.target.AppendSweep(w.near[:0], p.all.target.Select(class), t.Length, t.Max)
		w.target = w.target[:0]
		at := unit.Distance(0)
		for _, c := range p.all.cells {
			w.target = w.target.AppendPart(w.base, at, c.Target).AppendPart(w.near, c.Target, c.Target+c.Length)
			at = c.Target + c.Length
		}
		w.target = w.target.AppendPart(w.base, at, p.route.Target.Track.Length())
	} else {
		w.target = p.whole[1].AppendSweep(w.target[:0], p.whole[1].Select(class), t.Length, t.Max)
	}
	for i, f := range [...]step.Func{w.base, w.target} {
		w.turned[i] = append(w.turned[i][:0], f...)
		if p.direction == codes.Reverse {
			impact.Mirror(w.turned[i])
		}
	}
	w.before.Compute(w.turned[0], m, nil)
	w.after.Compute(w.turned[1], m, &w.before)
}

func (p *pair) running(f *Figures, train int, t Train, changes []delta.Delta, m impact.Motion, w *runs) {
	w.compute(p, t, m)
	before, after := &w.before, &w.after
	run := RunTime{Direction: p.direction, Train: train, Before: before.Tenths(), After: after.Tenths()}
	if len(changes) == 0 && run.Before == run.After {
		return
	}
	length := p.route.Target.Track.Length()
	// travelled gives how far along the way a place of the target's track lies.
	travelled := func(at unit.Distance) unit.Distance {
		if p.direction == codes.Reverse {
			return length - at
		}
		return at
	}
	if p.same {
		limits := middles(changes, length)
		if p.direction == codes.Reverse {
			slices.Reverse(limits)
		}
		sofar := int64(0)
		for k := range len(limits) - 1 {
			gained := run.Before - run.After
			if k < len(limits)-2 {
				at := travelled(limits[k+1])
				gained = tenths(before.At(at)) - tenths(after.At(at))
			}
			run.Parts = append(run.Parts, Part{min(limits[k], limits[k+1]), max(limits[k], limits[k+1]), gained - sofar})
			sofar = gained
		}
		slices.SortFunc(run.Parts, func(a, b Part) int { return cmp.Compare(a.From, b.From) })
	}
	f.Runs = append(f.Runs, run)
	for _, c := range changes {
		if c.After < c.Before {
			continue
		}
		cur := w.target.CursorAt(c.Target)
		piece := cur.Piece()
		middle := travelled(piece.From + (piece.To-piece.From)/2)
		if reached := after.Peak(middle); reached < piece.Speed {
			short := ShortRaise{p.direction, train, piece.From, piece.To, piece.Speed, reached, after.Needed(middle)}
			if n := len(f.Short); n == 0 || f.Short[n-1] != short {
				f.Short = append(f.Short, short)
			}
		}
	}
}

// middles cuts a track half way between changes that lie apart.
func middles(changes []delta.Delta, length unit.Distance) []unit.Distance {
	limits := []unit.Distance{0}
	for i := 1; i < len(changes); i++ {
		end, start := changes[i-1].Target+changes[i-1].Length, changes[i].Target
		if start-end >= joinGap {
			limits = append(limits, end+(start-end)/2)
		}
	}
	return append(limits, length)
}

func tenths(seconds float64) int64 { return int64(math.Floor(float64(seconds*10) + 0.5)) }

// onBase gives where a stretch of the target's track lies on the base's; false
// where that is not in one piece there.
func (p *pair) onBase(from, to unit.Distance) (unit.Distance, bool) {
	i := cellAt(p.cells, from)
	if i == len(p.cells) || p.cells[i].Target > from || to > p.cells[i].Target+p.cells[i].Length {
		return 0, false
	}
	return p.cells[i].Base + from - p.cells[i].Target, true
}

// cellAt gives the index of the first cell that ends beyond a place on the target's
// track.
func cellAt(cells []align.Cell, at unit.Distance) int {
	return sort.Search(len(cells), func(i int) bool { return cells[i].Target+cells[i].Length > at })
}

// seen tells whether the sides can differ on a stretch of the target's track.
func (p *pair) seen(from, to unit.Distance) bool {
	if !p.same {
		return true
	}
	i := cellAt(p.all.cells, from)
	return i < len(p.all.cells) && p.all.cells[i].Target < to
}

// fastest gives the time of approach of the fastest train that a side admits.
func fastest(c *profile.Compiler, from, to unit.Distance) int64 {
	near := c.Window(from, to, 0)
	least := int64(math.MaxInt64)
	var f step.Func
	for _, sel := range fleet.Selections(near) {
		f = near.AppendSweep(f[:0], sel, 0, profile.NoMaximum)
		least = min(least, impact.ApproachTenths(f, from, to))
	}
	return least
}

func (p *pair) crossings(f *Figures) {
	route := p.route.Target
	before := p.crossingsBefore()
	for i := range route.Places {
		place := &route.Places[i]
		from, to, ok := impact.Approach(place, p.direction, route.Track.Length())
		if !ok {
			continue
		}
		old := before[postsOf(&place.Row)]
		altered := old != nil && (old.StrikeIn != place.StrikeIn || old.WarningDS != place.WarningDS)
		if !altered && !p.seen(from, to) {
			continue
		}
		baseFrom, baseTo, onBase := p.approachBefore(old, from, to)
		compute := func(sides [2]*profile.Compiler) Crossing {
			c := Crossing{Direction: p.direction, Place: place, Old: old, Before: -1, After: fastest(sides[1], from, to)}
			if onBase {
				c.Before = fastest(sides[0], baseFrom, baseTo)
			}
			return c
		}
		now := compute(p.whole)
		if now.Before != now.After || altered {
			f.Crossings = append(f.Crossings, now)
		}
		if p.temporary {
			later := compute(p.withoutTemporary())
			later.Permanent = true
			if later.Before != later.After && (later.Before != now.Before || later.After != now.After) {
				f.Crossings = append(f.Crossings, later)
			}
		}
	}
}

// crossingsBefore gives the base's crossings by their places, for this direction of
// travel: each may have a row of its own, with its strike-in.
func (p *pair) crossingsBefore() map[posts]*schema.PlaceRow {
	list := map[posts]*schema.PlaceRow{}
	for i := range p.route.Base.Places {
		old := &p.route.Base.Places[i]
		if at := postsOf(&old.Row); old.Kind == schema.Crossing && old.Directions.Has(p.direction) && list[at] == nil {
			list[at] = old
		}
	}
	return list
}

// approachBefore gives the approach on the base's track: that of its own crossing,
// else the stretch of the target's, as far as the base has it.
func (p *pair) approachBefore(old *schema.PlaceRow, from, to unit.Distance) (baseFrom, baseTo unit.Distance, ok bool) {
	if old != nil {
		return impact.Approach(old, p.direction, p.route.Base.Track.Length())
	}
	base, ok := p.onBase(from, to)
	return base, base + to - from, ok
}

func (p *pair) curves(f *Figures, trains []Train) {
	longest := longestOf(trains)
	olds := map[posts]*schema.CurveRow{}
	for i := range p.route.Base.Curves {
		olds[postsOf(&p.route.Base.Curves[i].Row)] = &p.route.Base.Curves[i]
	}
	for i := range p.route.Target.Curves {
		row := &p.route.Target.Curves[i]
		base, onBase := p.onBase(row.Start, row.End)
		var old *schema.CurveRow
		if onBase {
			old = olds[postsOf(&row.Row)]
		}
		altered := old == nil || old.RadiusM != row.RadiusM || old.CantMM != row.CantMM
		if !altered && !p.seen(row.Start, row.End) {
			continue
		}
		first, lowest, slowest := len(f.Curves), unit.Speed(0), 0
		after := p.whole[1].Window(row.Start, row.End, longest)
		var before *profile.Compiler
		if onBase {
			before = p.whole[0].Window(base, base+row.End-row.Start, longest)
		}
		for t := range trains {
			c := Curve{Direction: p.direction, Row: row, Old: old, Trains: []int{t}, Category: trains[t].Cant}
			var low unit.Speed
			c.After, low = impact.Extremes(after.Compile(trains[t].Train), row.Start, row.End)
			if onBase {
				c.Before, _ = impact.Extremes(before.Compile(trains[t].Train), base, base+row.End-row.Start)
			}
			if lowest == 0 || low < lowest {
				lowest, slowest = low, t
			}
			if c.Before == c.After && !altered {
				continue
			}
			same := func(x Curve) bool { return x.Category == c.Category && x.Before == c.Before && x.After == c.After }
			if k := slices.IndexFunc(f.Curves[first:], same); k >= 0 {
				f.Curves[first+k].Trains = append(f.Curves[first+k].Trains, t)
				continue
			}
			f.Curves = append(f.Curves, c)
		}
		for k := first; k < len(f.Curves); k++ {
			f.Curves[k].Lowest, f.Curves[k].Slowest = lowest, slowest
		}
	}
}

// posts is the stretch that a row is for, as it is written in either revision.
type posts struct{ from, to chainage.Point }

func postsOf(r *schema.Row) posts { return posts{r.From.Plain(), r.To.Plain()} }
