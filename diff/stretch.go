package diff

import (
	"cmp"
	"encoding/binary"
	"slices"

	"speedtrail/diff/align"
	"speedtrail/diff/profile"
	"speedtrail/diff/step"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// StretchLimit is how many stretches an account describes in full. A release
// that changes more is not read picture by picture; its changes are all listed.
const StretchLimit = 200

const (
	// joinGap is the distance within which changes share one picture.
	joinGap = 1000 * unit.Metre
	// leastMargin is what a picture shows at least on each side of the change.
	leastMargin = 300 * unit.Metre
)

// Stretch is a picture of changes that lie close together in one direction of
// a route, and of the trains that see the same there: the same changes, the
// same profiles around them, governed by the same rows. Distances are running
// distances on the target's track.
type Stretch struct {
	Route                int // index in Account.Routes
	Direction            codes.Direction
	From, To             unit.Distance // from the first to the last change
	WindowFrom, WindowTo unit.Distance // what surrounds them, too
	Trains               []int         // indices in Account.Trains
	Changes              []int         // indices in Route.Changes, those of the first train
	Before, After        []Step        // in the window; Before has gaps where the base has no track
}

// Step is a piece of a profile in a picture.
type Step struct {
	step.Piece
	Sources int // index in Route.Sources
}

// describeStretches finds the stretches of all routes and describes the first
// StretchLimit of them by size of the largest step.
func (a *Account) describeStretches() {
	var all []Stretch
	for i := range a.Routes {
		all = append(all, a.Routes[i].clusters(i)...)
	}
	if len(all) > StretchLimit {
		order := slices.Clone(all)
		slices.SortStableFunc(order, func(x, y Stretch) int {
			return cmp.Compare(a.largestStep(&y), a.largestStep(&x))
		})
		a.StretchesLeftOut = len(all) - StretchLimit
		all = order[:StretchLimit]
		slices.SortStableFunc(all, func(x, y Stretch) int {
			return cmp.Or(cmp.Compare(x.Route, y.Route), cmp.Compare(x.Direction, y.Direction),
				cmp.Compare(x.From, y.From), cmp.Compare(x.Trains[0], y.Trains[0]))
		})
	}
	for _, s := range all {
		a.Stretches = append(a.Stretches, a.pictures(s)...)
	}
}

// largestStep gives the size of the largest change of a stretch; a raise counts
// before a reduction of the same size.
func (a *Account) largestStep(s *Stretch) unit.Speed {
	largest := unit.Speed(0)
	for _, i := range s.Changes {
		c := &a.Routes[s.Route].Changes[i]
		largest = max(largest, 2*(c.After-c.Before)+1, 2*(c.Before-c.After))
	}
	return largest
}

// clusters groups the changes of a route by nearness, and the trains whose
// changes there are equal.
func (r *Route) clusters(route int) []Stretch {
	type place struct {
		direction codes.Direction
		train     int
	}
	perTrain := map[place][]int{}
	var order []place
	for i, c := range r.Changes {
		p := place{c.Direction, c.Train}
		if perTrain[p] == nil {
			order = append(order, p)
		}
		perTrain[p] = append(perTrain[p], i)
	}
	slices.SortFunc(order, func(a, b place) int {
		return cmp.Or(cmp.Compare(a.direction, b.direction), cmp.Compare(a.train, b.train))
	})
	var found []Stretch
	seen := map[string]int{}
	for _, p := range order {
		changes := perTrain[p]
		for len(changes) > 0 {
			n := 1
			for n < len(changes) && r.Changes[changes[n]].From-r.Changes[changes[n-1]].To < joinGap {
				n++
			}
			cluster := changes[:n:n]
			changes = changes[n:]
			key := string(r.clusterKey(cluster))
			if i, ok := seen[key]; ok {
				found[i].Trains = append(found[i].Trains, p.train)
				continue
			}
			seen[key] = len(found)
			s := Stretch{
				Route: route, Direction: p.direction, Trains: []int{p.train}, Changes: cluster,
				From: r.Changes[cluster[0]].From, To: r.Changes[cluster[n-1]].To,
			}
			margin := max((s.To-s.From)/2, leastMargin)
			s.WindowFrom = max(0, s.From-margin)
			s.WindowTo = min(r.Target.Track.Length(), s.To+margin)
			found = append(found, s)
		}
	}
	slices.SortStableFunc(found, func(a, b Stretch) int {
		return cmp.Or(cmp.Compare(a.Direction, b.Direction), cmp.Compare(a.From, b.From), cmp.Compare(a.Trains[0], b.Trains[0]))
	})
	return found
}

// clusterKey writes the changes of a cluster without their train.
func (r *Route) clusterKey(cluster []int) []byte {
	var key []byte
	for _, i := range cluster {
		c := &r.Changes[i]
		runOut := int64(0)
		if c.RunOut {
			runOut = 1
		}
		for _, v := range [...]int64{int64(c.Direction), int64(c.From), int64(c.To), int64(c.Before), int64(c.After),
			runOut, int64(c.BeforeSources), int64(c.AfterSources)} {
			key = binary.AppendVarint(key, v)
		}
	}
	return key
}

// pictures compiles the profiles around a cluster and splits its trains where
// they see different ones.
func (a *Account) pictures(s Stretch) []Stretch {
	r := &a.Routes[s.Route]
	base := profile.New(r.Base, s.Direction, profile.All)
	target := profile.New(r.Target, s.Direction, profile.All)
	cells := align.Tracks(r.Base.Track, r.Target.Track).Common
	var list []Stretch
	seen := map[string]int{}
	for _, i := range s.Trains {
		t := a.Trains[i]
		before := r.steps(base, t, cells, s, true)
		after := r.steps(target, t, cells, s, false)
		var key []byte
		for _, steps := range [...][]Step{before, after} {
			for _, p := range steps {
				for _, v := range [...]int64{int64(p.From), int64(p.To), int64(p.Speed), int64(p.Sources)} {
					key = binary.AppendVarint(key, v)
				}
			}
			key = append(key, '|')
		}
		if k, ok := seen[string(key)]; ok {
			list[k].Trains = append(list[k].Trains, i)
			continue
		}
		seen[string(key)] = len(list)
		picture := s
		picture.Trains, picture.Before, picture.After = []int{i}, before, after
		picture.Changes = r.changesOf(s, i)
		list = append(list, picture)
	}
	return list
}

// changesOf lists the changes that a train sees in a stretch.
func (r *Route) changesOf(s Stretch, train int) []int {
	var list []int
	for i, c := range r.Changes {
		if c.Train == train && c.Direction == s.Direction && c.From >= s.From && c.To <= s.To {
			list = append(list, i)
		}
	}
	return list
}

// steps gives the pieces of a train's profile within the window, the base's
// laid on the target's track cell by cell.
func (r *Route) steps(c *profile.Compiler, t Train, cells []align.Cell, s Stretch, base bool) []Step {
	sel := c.Select(profile.ClassOf(t.Train))
	f := c.Sweep(sel, t.Length, t.Max)
	if !base {
		cells = []align.Cell{{Length: r.Target.Track.Length()}}
	}
	var steps []Step
	for _, cell := range cells {
		own := cell.Target // where the cell begins on the side that is drawn
		if base {
			own = cell.Base
		}
		from := max(s.WindowFrom, cell.Target) - cell.Target
		to := min(s.WindowTo, cell.Target+cell.Length) - cell.Target
		if from >= to {
			continue
		}
		for cur := f.CursorAt(own + from); from < to; {
			cur.Advance(own + from)
			p := cur.Piece()
			end := min(to, p.To-own)
			piece := step.Piece{From: cell.Target + from, To: cell.Target + end, Speed: p.Speed}
			steps = append(steps, Step{piece, r.sources.index(c, sel, t, own+from, end-from, p.Speed)})
			from = end
		}
	}
	return steps
}
