package diff

import (
	"cmp"
	"context"
	"encoding/binary"
	"slices"

	"speedtrail/diff/align"
	"speedtrail/diff/delta"
	"speedtrail/diff/profile"
	"speedtrail/diff/step"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// compareRoute fills in what differs on one route. Each train's changes are
// announced before they are described; an error ends the comparison, and so
// does the context between two trains.
func compareRoute(ctx context.Context, r *Route, trains []Train, o *Options, announce func(changes int) error) error {
	var base, target *chainage.Track
	if r.Base != nil {
		base = r.Base.Track
	}
	if r.Target != nil {
		target = r.Target.Track
	}
	for i := range r.Files {
		r.Files[i].account(base, target)
	}
	r.sources = sourceTable{route: r, seen: map[string]int{}, known: map[string]int{}}
	r.causes = newCauseTable(r)
	r.pieces = map[string]int{}
	switch {
	case r.Base == nil:
		r.wholeTrack(Added)
	case r.Target == nil:
		r.wholeTrack(Removed)
	default:
		if err := compareTracks(ctx, r, trains, o, announce); err != nil {
			return err
		}
	}
	r.Leaving = r.leaving(trains)
	r.explain(trains)
	r.causes = causeTable{} // no longer needed
	return ctx.Err()
}

// compareTracks compares a route that both revisions have.
func compareTracks(ctx context.Context, r *Route, trains []Train, o *Options, announce func(changes int) error) error {
	tracks := align.Tracks(r.Base.Track, r.Target.Track)
	for _, c := range tracks.Common {
		for _, at := range [...]unit.Distance{c.Target, c.Target + c.Length} {
			if at > 0 && at < r.Target.Track.Length() {
				r.causes.joints = append(r.causes.joints, at)
			}
		}
	}
	longest := longestOf(trains)
	for _, d := range codes.AllDirections {
		inBase, inTarget := r.Base.Directions.Has(d), r.Target.Directions.Has(d)
		switch {
		case inBase && inTarget:
			for _, i := range tracks.Removed {
				r.Track = append(r.Track, TrackChange{d, Removed, i.From, i.To, 0})
			}
			for _, i := range tracks.Added {
				r.Track = append(r.Track, TrackChange{d, Added, i.From, i.To, 0})
			}
			r.Dated = append(r.Dated, r.dated(d, tracks.Common, trains)...)
			p := newPair(r, d, &tracks, longest)
			if err := p.compare(ctx, trains, announce); err != nil {
				return err
			}
			if !o.NoFleet {
				r.Fleet = append(r.Fleet, p.fleet(trains)...)
			}
			if !o.NoFigures {
				if err := p.figures(ctx, trains, o.Rolling); err != nil {
					return err
				}
			}
		case inBase:
			r.Track = append(r.Track, TrackChange{d, Removed, 0, r.Base.Track.Length(), 0})
		case inTarget:
			r.Track = append(r.Track, TrackChange{d, Added, 0, r.Target.Track.Length(), 0})
		}
	}
	// Trains are sorted by id, so that their index is their order.
	for _, list := range [...][]Change{r.Changes, r.Masked} {
		slices.SortFunc(list, func(a, b Change) int {
			return cmp.Or(cmp.Compare(a.Direction, b.Direction), cmp.Compare(a.From, b.From), cmp.Compare(a.Train, b.Train))
		})
	}
	return nil
}

// wholeTrack states a route that only one revision has.
func (r *Route) wholeTrack(f Fate) {
	route := r.Target
	if f == Removed {
		route = r.Base
	}
	for _, d := range codes.AllDirections {
		if route.Directions.Has(d) {
			r.Track = append(r.Track, TrackChange{d, f, 0, route.Track.Length(), 0})
		}
	}
}

// pair is both sides of a route in one direction of travel.
type pair struct {
	route     *Route
	direction codes.Direction
	cells     []align.Cell
	whole     [2]*profile.Compiler // of all rows: base, target
	lasting   [2]*profile.Compiler // of those that are not temporary; see withoutTemporary
	all       sides
	permanent sides    // without temporary restrictions; the same as all where none lies there
	same      bool     // whether the tracks are
	temporary bool     // whether a side has temporary restrictions
	hides     bool     // whether one lies where the sides can differ
	sights    []*sight // by train
}

// sides are the compilers of both sides, and where they can differ. Where the
// tracks are the same they hold the rows only that can matter there.
type sides struct {
	base, target *profile.Compiler
	cells        []align.Cell
	memory       *[2]step.Func // for profiles, used again
}

// sight is what a train sees. Trains that no row tells apart share one.
type sight struct{ changes, masked []delta.Delta }

func newPair(r *Route, d codes.Direction, tracks *align.Alignment, longest unit.Distance) *pair {
	p := &pair{route: r, direction: d, cells: tracks.Common, same: tracks.Whole()}
	p.whole = [2]*profile.Compiler{profile.New(r.Base, d, profile.All), profile.New(r.Target, d, profile.All)}
	memory := new([2]step.Func)
	narrow := func(base, target *profile.Compiler) sides {
		s := sides{base, target, tracks.Common, memory}
		if !p.same {
			return s
		}
		var near []align.Interval
		s.base, s.target, near = profile.Narrow(base, target, longest)
		s.cells = nil
		for _, i := range near {
			s.cells = append(s.cells, align.Cell{Base: i.From, Target: i.From, Length: i.To - i.From})
		}
		return s
	}
	p.all = narrow(p.whole[0], p.whole[1])
	p.permanent = p.all
	p.temporary = len(r.Base.Temporary)+len(r.Target.Temporary) > 0
	p.hides = p.all.base.HasTemporary() || p.all.target.HasTemporary()
	if p.hides {
		lasting := p.withoutTemporary()
		p.permanent = narrow(lasting[0], lasting[1])
	}
	return p
}

// withoutTemporary gives the compilers of all rows that are not temporary
// restrictions.
func (p *pair) withoutTemporary() [2]*profile.Compiler {
	if p.lasting[0] == nil {
		p.lasting = [2]*profile.Compiler{p.whole[0].Permanent(), p.whole[1].Permanent()}
	}
	return p.lasting
}

func longestOf(trains []Train) (longest unit.Distance) {
	for _, t := range trains {
		longest = max(longest, t.Length)
	}
	return longest
}

// compare compiles both sides for every train and appends the changes.
func (p *pair) compare(ctx context.Context, trains []Train, announce func(changes int) error) error {
	r := p.route
	p.sights = make([]*sight, len(trains))
	known := map[string]*sight{}
	delayed := p.all.base.Delayed() || p.all.target.Delayed()
	var key []byte
	for i, t := range trains {
		if err := ctx.Err(); err != nil {
			return err
		}
		class := profile.ClassOf(t.Train)
		before, after := p.all.base.Select(class), p.all.target.Select(class)
		length := t.Length
		if !delayed {
			length = 0
		}
		// Trains that no row tells apart are compared once.
		key = appendKey(key[:0], before, after, length, t.Max)
		s, ok := known[string(key)]
		if !ok {
			s = p.look(before, after, class, t.Length, t.Max)
			known[string(key)] = s
		}
		p.sights[i] = s
		if err := announce(len(s.changes) + len(s.masked)); err != nil {
			return err
		}
		for _, c := range s.changes {
			r.Changes = append(r.Changes, p.change(p.all, before, after, i, t, c))
		}
		if len(s.masked) > 0 {
			before, after := p.permanent.base.Select(class), p.permanent.target.Select(class)
			for _, c := range s.masked {
				r.Masked = append(r.Masked, p.change(p.permanent, before, after, i, t, c))
			}
		}
	}
	return nil
}

// look finds what a train sees.
func (p *pair) look(before, after profile.Selection, class profile.Class, length unit.Distance, maximum unit.Speed) *sight {
	s := &sight{changes: p.all.compare(before, after, length, maximum)}
	if p.hides {
		permanent := p.permanent.compare(p.permanent.base.Select(class), p.permanent.target.Select(class), length, maximum)
		s.masked = hidden(permanent, s.changes)
	}
	return s
}

// compare finds the differences that one train sees.
func (s sides) compare(before, after profile.Selection, length unit.Distance, maximum unit.Speed) []delta.Delta {
	if len(s.cells) == 0 {
		return nil
	}
	sweep := func(length unit.Distance) (b, t step.Func) {
		m := s.memory
		m[0] = s.base.AppendSweep(m[0][:0], before, length, maximum)
		m[1] = s.target.AppendSweep(m[1][:0], after, length, maximum)
		return m[0], m[1]
	}
	b, t := sweep(length)
	found := delta.Between(b, t, s.cells)
	if len(found) > 0 {
		b, t = sweep(0)
		found = delta.MarkRunOut(found, b, t)
	}
	return found
}

// change describes a difference.
func (p *pair) change(s sides, before, after profile.Selection, train int, t Train, d delta.Delta) Change {
	r := p.route
	c := Change{
		Direction: p.direction, From: d.Target, To: d.Target + d.Length, Train: train,
		Before: d.Before, After: d.After, RunOut: d.RunOut,
		BeforeSources: r.sources.index(r.Base, s.base, before, t, d.Base, d.Length, d.Before),
		AfterSources:  r.sources.index(r.Target, s.target, after, t, d.Target, d.Length, d.After),
	}
	c.Causes = r.causes.of(&c, profile.ClassOf(t.Train), t.Length)
	return c
}

// appendKey writes what a profile depends on.
func appendKey(key []byte, before, after profile.Selection, length unit.Distance, maximum unit.Speed) []byte {
	for _, sel := range [...]profile.Selection{before, after} {
		for _, v := range sel {
			key = append(key, byte(v/unit.SpeedStep))
		}
	}
	key = binary.AppendVarint(key, int64(length))
	return binary.AppendVarint(key, int64(maximum))
}

// sourceTable keeps each distinct list of governing rows of a route once.
type sourceTable struct {
	route *Route
	seen  map[string]int // by the text of the sources
	known map[string]int // by side, rows and kind of train: quicker to tell
	key   []byte
	rows  []int32
}

// index gives the place in Route.Sources of the rows that give the speed v to
// the train on a stretch of the side of a compiler.
func (s *sourceTable) index(side *schema.Route, c *profile.Compiler, sel profile.Selection, t Train, from, length unit.Distance, v unit.Speed) int {
	s.rows = c.AppendGoverning(s.rows[:0], sel, t.Length, t.Max, from, from+length, v)
	class := profile.ClassOf(t.Train)
	quick := append(s.key[:0], byte(class.Cant), byte(class.Categories), byte(class.AxleLoad), 0)
	if side == s.route.Base {
		quick[3] = 1
	}
	for _, row := range s.rows {
		quick = c.AppendRowKey(quick, row)
		if row == profile.TrainRow {
			quick = append(quick, t.ID...)
		}
	}
	s.key = quick
	if i, ok := s.known[string(quick)]; ok {
		return i
	}
	i := s.find(c, t)
	s.known[string(quick)] = i
	return i
}

// find gives the place of the list by what it says.
func (s *sourceTable) find(c *profile.Compiler, t Train) int {
	var key []byte
	for _, row := range s.rows {
		key = c.AppendSourceKey(key, row, t.Train)
	}
	if i, ok := s.seen[string(key)]; ok {
		return i
	}
	list := make([]profile.Source, len(s.rows))
	for i, row := range s.rows {
		list[i] = c.Source(row, t.Train)
	}
	i := len(s.route.Sources)
	s.seen[string(key)] = i
	s.route.Sources = append(s.route.Sources, list)
	return i
}
