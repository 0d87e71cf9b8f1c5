package diff

import (
	"cmp"
	"encoding/binary"
	"slices"
	"sort"

	"speedtrail/diff/align"
	"speedtrail/diff/profile"
	"speedtrail/diff/step"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/parallel"
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
	perRoute := make([][]Stretch, len(a.Routes))
	parallel.Each(len(a.Routes), func(i int) { perRoute[i] = a.Routes[i].clusters(i, len(a.Trains)) })
	all := slices.Concat(perRoute...)
	if len(all) > StretchLimit {
		a.StretchesLeftOut = len(all) - StretchLimit
		all = a.largest(all)
	}
	var starts []int // of each route's stretches
	for i := range all {
		if i == 0 || all[i].Route != all[i-1].Route {
			starts = append(starts, i)
		}
	}
	starts = append(starts, len(all))
	lists := make([][]Stretch, len(starts)-1)
	parallel.Each(len(lists), func(i int) { lists[i] = a.pictures(all[starts[i]:starts[i+1]]) })
	a.Stretches = slices.Concat(lists...)
	for i := range a.Routes {
		a.Routes[i].sources, a.Routes[i].pieces = sourceTable{}, nil // no longer needed
	}
}

// largest gives the StretchLimit stretches with the largest steps, in the order
// in which they stand.
func (a *Account) largest(all []Stretch) []Stretch {
	steps, order := make([]unit.Speed, len(all)), make([]int, len(all))
	for i := range all {
		steps[i], order[i] = a.largestStep(&all[i]), i
	}
	slices.SortFunc(order, func(x, y int) int { return cmp.Or(cmp.Compare(steps[y], steps[x]), x-y) })
	chosen := make([]Stretch, StretchLimit)
	for i, at := range slices.Sorted(slices.Values(order[:StretchLimit])) {
		chosen[i] = all[at]
	}
	return chosen
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
func (r *Route) clusters(route, trains int) []Stretch {
	// The changes of each direction and train, in one list cut into pieces.
	perTrain := make([][]int, 2*trains)
	counts := make([]int, len(perTrain))
	at := func(c *Change) int { return int(c.Direction)*trains + c.Train }
	for i := range r.Changes {
		counts[at(&r.Changes[i])]++
	}
	rest := make([]int, len(r.Changes))
	for i, n := range counts {
		perTrain[i], rest = rest[:0:n], rest[n:]
	}
	for i := range r.Changes {
		k := at(&r.Changes[i])
		perTrain[k] = append(perTrain[k], i)
	}
	var found []Stretch
	seen := map[string]int{}
	var key []byte
	for place, changes := range perTrain {
		direction, train := codes.Direction(place/trains), place%trains
		for len(changes) > 0 {
			n := 1
			for n < len(changes) && r.Changes[changes[n]].From-r.Changes[changes[n-1]].To < joinGap {
				n++
			}
			cluster := changes[:n:n]
			changes = changes[n:]
			key = r.appendClusterKey(key[:0], cluster)
			if i, ok := seen[string(key)]; ok {
				found[i].Trains = append(found[i].Trains, train)
				continue
			}
			seen[string(key)] = len(found)
			s := Stretch{
				Route: route, Direction: direction, Trains: []int{train}, Changes: cluster,
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

// appendClusterKey writes the changes of a cluster without their train.
func (r *Route) appendClusterKey(key []byte, cluster []int) []byte {
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

// pictures describes stretches of one route.
func (a *Account) pictures(stretches []Stretch) []Stretch {
	r := &a.Routes[stretches[0].Route]
	cells := align.Tracks(r.Base.Track, r.Target.Track).Common
	var whole [2][2]*profile.Compiler // by direction: base, target
	var list []Stretch
	for _, s := range stretches {
		w := &whole[s.Direction]
		if w[0] == nil {
			*w = [2]*profile.Compiler{profile.New(r.Base, s.Direction, profile.All), profile.New(r.Target, s.Direction, profile.All)}
		}
		list = append(list, a.split(s, w, cells)...)
	}
	return list
}

// split compiles the profiles around a cluster and splits its trains where they
// see different ones.
func (a *Account) split(s Stretch, whole *[2]*profile.Compiler, cells []align.Cell) []Stretch {
	r := &a.Routes[s.Route]
	longest := unit.Distance(0)
	for _, i := range s.Trains {
		longest = max(longest, a.Trains[i].Length)
	}
	var near [2][]align.Cell // what of the cells lies in the window, for either side
	near[1] = []align.Cell{{Base: s.WindowFrom, Target: s.WindowFrom, Length: s.WindowTo - s.WindowFrom}}
	first, last := r.Base.Track.Length(), unit.Distance(0)
	for _, c := range cells {
		from, to := max(s.WindowFrom, c.Target), min(s.WindowTo, c.Target+c.Length)
		if from < to {
			c = align.Cell{Base: c.Base + from - c.Target, Target: from, Length: to - from}
			near[0] = append(near[0], c)
			first, last = min(first, c.Base), max(last, c.Base+c.Length)
		}
	}
	base, target := whole[0].Window(first, last, longest), whole[1].Window(s.WindowFrom, s.WindowTo, longest)
	var list []Stretch
	seen := map[string]int{}
	for _, i := range s.Trains {
		t := a.Trains[i]
		before, after := r.steps(r.Base, base, t, near[0]), r.steps(r.Target, target, t, near[1])
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

// changesOf lists the changes that a train sees in a stretch. The changes of a
// route are in the order of direction and place.
func (r *Route) changesOf(s Stretch, train int) []int {
	var list []int
	first := sort.Search(len(r.Changes), func(i int) bool {
		c := &r.Changes[i]
		return cmp.Or(cmp.Compare(c.Direction, s.Direction), cmp.Compare(c.From, s.From)) >= 0
	})
	for i := first; i < len(r.Changes); i++ {
		c := &r.Changes[i]
		if c.Direction != s.Direction || c.From >= s.To {
			break
		}
		if c.Train == train && c.To <= s.To {
			list = append(list, i)
		}
	}
	return list
}

// steps cuts the profile of one side to cells, and lays it on the target's
// track.
func (r *Route) steps(side *schema.Route, c *profile.Compiler, t Train, cells []align.Cell) []Step {
	sel := c.Select(profile.ClassOf(t.Train))
	f := c.Sweep(sel, t.Length, t.Max)
	var steps []Step
	for _, cell := range cells {
		from := unit.Distance(0)
		for cur := f.CursorAt(cell.Base); from < cell.Length; {
			cur.Advance(cell.Base + from)
			p := cur.Piece()
			end := min(cell.Length, p.To-cell.Base)
			piece := step.Piece{From: cell.Target + from, To: cell.Target + end, Speed: p.Speed}
			steps = append(steps, Step{piece, r.sources.index(side, c, sel, t, cell.Base+from, end-from, p.Speed)})
			from = end
		}
	}
	return steps
}
