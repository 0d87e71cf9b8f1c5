package diff

import (
	"encoding/binary"
	"slices"
	"sort"

	"speedtrail/diff/align"
	"speedtrail/diff/scope"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// Declared is a declaration of a request in play and what of it was seen.
type Declared struct {
	Request, Declaration int // indices in Account.Requests and its Declare
	Route                int // index in Account.Routes; -1 for a route whose files are the same in both
	Seen                 []Seen
	Track                unit.Distance // length of added and removed track that it holds, over both directions
	Dated                unit.Distance // the same of where temporary restrictions hold at other times, in its sense

	trains       []int           // indices in Account.Trains; nil: every train
	base, target *align.Interval // in running distances; nil where the side has not the positions
}

// Seen is how much a train was seen to change inside a declaration.
type Seen struct {
	Train          int // index in Account.Trains
	Inside, RunOut unit.Distance
	Hidden         unit.Distance // today, by temporary restrictions: not in the others
}

// Unseen tells whether nothing of the declaration was observed.
func (d *Declared) Unseen() bool { return len(d.Seen) == 0 && d.Track == 0 && d.Dated == 0 }

// Names tells whether a declaration of any effect names a train.
func (d *Declared) Names(train string, a *Account) bool {
	x := &a.Requests[d.Request].Declare[d.Declaration]
	return x.Effect == schema.AnyEffect && slices.Contains(x.Trains, train)
}

// reconcile locates what the requests in play declare and sets it against what
// was observed. The error is a *source.Faults for requests that name what is not
// there, else one of Options.Unread.
func (a *Account) reconcile(o *Options) error {
	a.Reconciled = !o.NoRequests
	if o.NoRequests {
		return nil
	}
	var faults source.Collector
	for i := range a.Requests {
		for k := range a.Requests[i].Declare {
			d, err := a.locate(o, &a.Requests[i].Declare[k], &faults)
			if err != nil {
				return err
			}
			d.Request, d.Declaration = i, k
			a.Declared = append(a.Declared, d)
		}
	}
	if err := faults.Err(); err != nil {
		return err
	}
	for i := range a.Routes {
		a.reconcileRoute(i)
	}
	for i := range a.Trains {
		t := &a.Trains[i]
		for _, d := range a.Declared {
			x := &a.Requests[d.Request].Declare[d.Declaration]
			t.Declared = t.Declared || t.Fate != Kept && x.Effect == schema.AnyEffect && slices.Contains(d.trains, i)
		}
	}
	return nil
}

// locate finds the route, the trains and the positions of a declaration.
func (a *Account) locate(o *Options, x *schema.Declaration, faults *source.Collector) (Declared, error) {
	d := Declared{Route: slices.IndexFunc(a.Routes, func(r Route) bool { return r.ID == x.Route })}
	for k, id := range x.Trains {
		i := slices.IndexFunc(a.Trains, func(t Train) bool { return t.ID == id })
		if i < 0 {
			var known []string
			for _, t := range a.Trains {
				known = append(known, t.ID)
			}
			faults.Add(x.Places.Trains[k], "the declaration names train %s, which neither revision has%s", source.Quote(id), schema.Meant(id, known))
			continue
		}
		d.trains = append(d.trains, i)
	}
	var sides [2]*schema.Route
	if d.Route >= 0 {
		sides = [2]*schema.Route{a.Routes[d.Route].Base, a.Routes[d.Route].Target}
	} else if o.Unread != nil {
		r, err := o.Unread(x.Route)
		if err != nil {
			return d, err
		}
		sides[1] = r
	}
	if sides[0] == nil && sides[1] == nil {
		faults.Add(x.Places.Route, "the declaration names route %s, which neither revision has", source.Quote(x.Route))
		return d, nil
	}
	var at source.Position
	problem := ""
	for i, r := range sides {
		if r == nil {
			continue
		}
		interval, why := span(r.Track, x)
		if why != nil {
			at, problem = why.Position, why.Problem
			continue
		}
		if i == 0 {
			d.base = interval
		} else {
			d.target = interval
		}
	}
	if d.base == nil && d.target == nil {
		faults.Add(at, "the declaration on route %s: %s", source.Quote(x.Route), problem)
	}
	if sides[0] != nil && sides[1] != nil && (d.base == nil) != (d.target == nil) {
		d.acrossTracks(align.Tracks(sides[0].Track, sides[1].Track).Common)
	}
	return d, nil
}

// acrossTracks gives a declaration, of which only one revision has both ends, its
// stretch on the other one: that between the outermost points which both have.
func (d *Declared) acrossTracks(common []align.Cell) {
	have, other, byTarget := d.base, &d.target, d.base == nil
	if byTarget {
		have, other = d.target, &d.base
	}
	for _, c := range common {
		own, there := c.Base, c.Target
		if byTarget {
			own, there = c.Target, c.Base
		}
		from, to := max(have.From, own), min(have.To, own+c.Length)
		if from >= to {
			continue
		}
		from, to = from-own+there, to-own+there
		if *other == nil {
			*other = &align.Interval{From: from, To: to}
		}
		(*other).From, (*other).To = min((*other).From, from), max((*other).To, to)
	}
}

// span finds the stretch of a declaration on a track, or says why it is not there.
func span(t *chainage.Track, x *schema.Declaration) (*align.Interval, *source.Fault) {
	s := x.Span
	var at [2]unit.Distance
	for i, p := range [...]chainage.Point{s.From, s.To} {
		d, err := t.Find(p)
		if err != nil {
			return nil, &source.Fault{
				Position: [...]source.Position{x.Places.From, x.Places.To}[i], Problem: [...]string{"from_km ", "to_km "}[i] + p.String() + " is " + schema.LocationProblem(t, p, err),
			}
		}
		at[i] = d
	}
	if at[0] >= at[1] {
		return nil, &source.Fault{Position: x.Places.To, Problem: "to_km " + s.To.String() + " does not lie after from_km " + s.From.String() + " along the track in the nominal direction"}
	}
	return &align.Interval{From: at[0], To: at[1]}, nil
}

// inPlay is what declarations say of one side of a route.
type inPlay struct {
	list   []scope.Declared
	owners []int // of each, the index in Account.Declared
}

func (p *inPlay) add(d scope.Declared, owner int) {
	p.list, p.owners = append(p.list, d), append(p.owners, owner)
}

// reconcileRoute cuts the changes of a route, and the track that one side only has,
// at the limits of the declarations.
func (a *Account) reconcileRoute(index int) {
	r := &a.Routes[index]
	r.Pieces = [][]scope.Piece{nil} // the first: no declaration holds any of it
	var changes inPlay
	var track [2]inPlay // base, target
	for i := range a.Declared {
		d := &a.Declared[i]
		if d.Route != index || d.base == nil && d.target == nil {
			continue
		}
		x := &a.Requests[d.Request].Declare[d.Declaration]
		// A side that has nothing of it has an empty stretch, in which nothing lies.
		var sides [2]align.Interval
		for side, interval := range [...]*align.Interval{d.base, d.target} {
			if interval == nil {
				continue
			}
			sides[side] = *interval
			if x.Effect == schema.AnyEffect && d.trains == nil {
				track[side].add(scope.Declared{Directions: x.Span.Directions, From: interval.From, To: interval.To, Effect: x.Effect}, i)
			}
		}
		changes.add(scope.Declared{
			Directions: x.Span.Directions, From: sides[1].From, To: sides[1].To, Effect: x.Effect, Trains: d.trains, Base: &sides[0],
		}, i)
	}
	a.reconcileTrack(r, &track)
	a.reconcileDates(r, &changes)
	if len(changes.list) > 0 {
		a.reconcileChanges(r, &changes)
	}
	for i := range a.Declared {
		if d := &a.Declared[i]; d.Route == index {
			slices.SortFunc(d.Seen, func(x, y Seen) int { return x.Train - y.Train })
		}
	}
}

// reconcileTrack cuts the track that one side only has. Removed track stands on the
// base's.
func (a *Account) reconcileTrack(r *Route, declared *[2]inPlay) {
	for i := range r.Track {
		t := &r.Track[i]
		on := &declared[1]
		if t.Fate == Removed {
			on = &declared[0]
		}
		o := scope.Observed{Direction: t.Direction, From: t.From, To: t.To, Train: -1}
		t.Pieces = r.pieceIndex(scope.Cut(&o, on.list), on.owners)
		for k := range on.list {
			inside, _ := scope.Seen(&o, &on.list[k])
			a.Declared[on.owners[k]].Track += inside
		}
	}
}

// reconcileDates adds up where restrictions hold at other times that a declaration can
// have asked for: by dates alone no speed of the comparison changes.
func (a *Account) reconcileDates(r *Route, declared *inPlay) {
	for _, x := range r.Dated {
		for k, d := range declared.list {
			inSense := d.Effect == schema.AnyEffect || d.Effect == schema.Raise && x.Faster || d.Effect == schema.Lower && x.Slower
			if from, to := max(x.From, d.From), min(x.To, d.To); from < to && inSense && d.Directions.Has(x.Direction) {
				a.Declared[declared.owners[k]].Dated += to - from
			}
		}
	}
}

// reconcileChanges cuts the changes of a route, and adds up what each declaration
// sees of them.
func (a *Account) reconcileChanges(r *Route, declared *inPlay) {
	type eyes struct {
		direction codes.Direction
		train     int
	}
	visible := map[eyes][]scope.Observed{}
	var common []align.Cell
	if r.Base != nil && r.Target != nil {
		common = align.Tracks(r.Base.Track, r.Target.Track).Common
	}
	for i := range r.Changes {
		c := &r.Changes[i]
		o := a.observed(r, c, common, false)
		c.Pieces = r.pieceIndex(scope.Cut(&o, declared.list), declared.owners)
		visible[eyes{c.Direction, c.Train}] = append(visible[eyes{c.Direction, c.Train}], o)
		for k := range declared.list {
			if inside, runOut := scope.Seen(&o, &declared.list[k]); inside+runOut > 0 {
				s := a.Declared[declared.owners[k]].seenBy(c.Train)
				s.Inside += inside
				s.RunOut += runOut
			}
		}
	}
	for i := range r.Masked {
		c := &r.Masked[i]
		o := a.observed(r, c, common, true)
		c.Pieces = r.pieceIndex(scope.Cut(&o, declared.list), declared.owners)
		for k := range declared.list {
			d := &declared.list[k]
			inside, runOut := scope.Seen(&o, d)
			// What is seen today, and goes further without temporary restrictions,
			// counts once.
			seen, ran := scope.SeenBoth(&o, visible[eyes{c.Direction, c.Train}], d)
			if hidden := inside + runOut - seen - ran; hidden > 0 {
				a.Declared[declared.owners[k]].seenBy(c.Train).Hidden += hidden
			}
		}
	}
}

// observed gives a change as declarations see it; common is the track that both
// revisions have; permanent, without temporary restrictions.
func (a *Account) observed(r *Route, c *Change, common []align.Cell, permanent bool) scope.Observed {
	t := a.Trains[c.Train].Train
	o := scope.Observed{Direction: c.Direction, From: c.From, To: c.To, Train: c.Train, TrainLength: t.Length, Raised: c.Raised(), RunOut: c.RunOut}
	o.RowEnds = r.rowEnds(c)
	if o.RunOut && o.Raised {
		o.Ahead = ahead(common, c.From)
		gone, same := r.holding(c, o.Ahead, t, permanent)
		o.RowEnds, o.Same = append(o.RowEnds, gone...), same
	}
	return o
}

// ahead gives by how much a point of the target's track that both have lies further
// on than on the base's.
func ahead(common []align.Cell, at unit.Distance) unit.Distance {
	i := sort.Search(len(common), func(i int) bool { return common[i].Target+common[i].Length > at })
	return common[i].Target - common[i].Base
}

// seenBy gives the entry of a train, a new one where it has none.
func (d *Declared) seenBy(train int) *Seen {
	i := slices.IndexFunc(d.Seen, func(s Seen) bool { return s.Train == train })
	if i < 0 {
		i = len(d.Seen)
		d.Seen = append(d.Seen, Seen{Train: train})
	}
	return &d.Seen[i]
}

// pieceIndex gives the place of a list in Route.Pieces; 0 for a list of one
// piece that no declaration holds. owners are the declarations by their index in
// the list that was cut with.
func (r *Route) pieceIndex(pieces []scope.Piece, owners []int) int {
	if len(pieces) == 1 && pieces[0].By == scope.Outside {
		return 0
	}
	var key []byte
	for i := range pieces {
		p := &pieces[i]
		if p.By != scope.Outside {
			p.By = owners[p.By]
		}
		for _, v := range [...]int64{int64(p.From), int64(p.To), int64(p.By)} {
			key = binary.AppendVarint(key, v)
		}
		if p.RunOut {
			key = append(key, 1)
		} else {
			key = append(key, 0)
		}
	}
	i, ok := r.pieces[string(key)]
	if !ok {
		i = len(r.Pieces)
		r.pieces[string(key)] = i
		r.Pieces = append(r.Pieces, pieces)
	}
	return i
}
