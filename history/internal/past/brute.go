package past

import (
	"context"
	"slices"
	"testing/fstest"

	"speedtrail/diff/profile"
	"speedtrail/history/compose"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Brute is a history of which every commit was read by itself.
type Brute struct {
	History []compose.Commit
	Data    []*schema.Dataset // nil: it does not load
}

// Load reads every commit.
func Load(history []compose.Commit) *Brute {
	b := &Brute{History: history, Data: make([]*schema.Dataset, len(history))}
	for i, c := range history {
		files := fstest.MapFS{}
		for name, content := range c.Files {
			files[name] = &fstest.MapFile{Data: []byte(content)}
		}
		b.Data[i], _ = schema.Load(context.Background(), files)
	}
	return b
}

// Route finds a route at a commit; nil where there is none.
func (b *Brute) Route(commit int, id string) *schema.Route {
	for _, r := range b.Data[commit].Routes {
		if r.ID == id {
			return r
		}
	}
	return nil
}

// Case is a point of the newest track, for a train, in a direction.
type Case struct {
	Route       string
	Train       schema.Train
	Direction   codes.Direction
	At          unit.Distance
	FirstParent bool
}

// Step is a commit at which the speed changed, and what was before it.
type Step struct {
	Commit int
	After  unit.Speed
	Before []unit.Speed
}

// Speed compiles the route at a commit and looks at the point that reads what
// the point of the newest track reads; 0 where there is no such track.
func (b *Brute) Speed(commit int, q Case) unit.Speed {
	route := b.Route(commit, q.Route)
	if route == nil || !route.Directions.Has(q.Direction) {
		return 0
	}
	newest := b.Route(len(b.Data)-1, q.Route)
	km, n := reading(newest.Track, min(q.At, newest.Track.Length()-1))
	for _, s := range route.Track.Segments() {
		if s.From <= km && km < s.To {
			if n--; n == 0 {
				return profile.New(route, q.Direction, profile.All).Compile(q.Train).At(s.Start + km - s.From)
			}
		}
	}
	return 0
}

// reading gives the chainage of a point and which of the places with this
// chainage it is.
func reading(t *chainage.Track, at unit.Distance) (km unit.Distance, n int) {
	segments := t.Segments()
	i := 0
	for segments[i].End() <= at {
		i++
	}
	km = segments[i].From + at - segments[i].Start
	for _, s := range segments[:i+1] {
		if s.From <= km && km < s.To {
			n++
		}
	}
	return km, n
}

// before lists the nearest commits before one that load, by going back from
// each parent through those that do not.
func (b *Brute) before(commit int, firstParent bool) []int {
	parents := b.History[commit].Parents
	if firstParent && len(parents) > 1 {
		parents = parents[:1]
	}
	var list []int
	for _, p := range parents {
		found := []int{p}
		if b.Data[p] == nil {
			found = b.before(p, firstParent)
		}
		for _, x := range found {
			if !slices.Contains(list, x) {
				list = append(list, x)
			}
		}
	}
	return list
}

// Steps finds the steps, in ascending order of their commits.
func (b *Brute) Steps(q Case) []Step {
	var list []Step
	for c, reached := range b.reached(q.FirstParent) {
		if b.Data[c] == nil || !reached {
			continue
		}
		before := b.before(c, q.FirstParent)
		now := b.Speed(c, q)
		step := Step{Commit: c, After: now}
		for _, p := range before {
			v := b.Speed(p, q)
			if v == now {
				step.Commit = -1
			}
			if !slices.Contains(step.Before, v) {
				step.Before = append(step.Before, v)
			}
		}
		if len(before) == 0 && now == 0 {
			step.Commit = -1
		}
		if step.Commit >= 0 {
			list = append(list, step)
		}
	}
	return list
}

func (b *Brute) reached(firstParent bool) []bool {
	list := make([]bool, len(b.History))
	list[len(list)-1] = true
	for c := len(list) - 1; c >= 0; c-- {
		if !list[c] {
			continue
		}
		for i, p := range b.History[c].Parents {
			if i == 0 || !firstParent {
				list[p] = true
			}
		}
	}
	return list
}

// Leads gives the commits to which going back from a commit leads along those that
// have the same speed, itself among them; none where it does not load.
func (b *Brute) Leads(commit int, q Case) map[int]bool {
	leads := map[int]bool{}
	var goBack func(c int)
	goBack = func(c int) {
		leads[c] = true
		for _, p := range b.before(c, q.FirstParent) {
			if !leads[p] && b.Speed(p, q) == b.Speed(c, q) {
				goBack(p)
			}
		}
	}
	if b.Data[commit] != nil {
		goBack(commit)
	}
	return leads
}

// Origin goes back from the newest commit along the first of the parents that
// have the same speed.
func (b *Brute) Origin(q Case) int {
	c := len(b.History) - 1
	now := b.Speed(c, q)
	for {
		next := -1
		for _, p := range b.before(c, q.FirstParent) {
			if next < 0 && b.Speed(p, q) == now {
				next = p
			}
		}
		if next < 0 {
			return c
		}
		c = next
	}
}
