package diff_test

import (
	"cmp"
	"context"
	"flag"
	"fmt"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff"
	"speedtrail/diff/internal/metre"
	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// pair is two revisions of a data set that a draw made.
type pair struct {
	grid         unit.Distance
	base, target *schema.Dataset
}

// drawPair draws two routes, of which each may be missing on one side, and
// trains, of which each may be missing or defined otherwise on one side.
func drawPair(t *rapid.T) pair {
	d := metre.Dice(func(low, high int) int { return rapid.IntRange(low, high).Draw(t, "") })
	p := pair{d.Grid(), &schema.Dataset{}, &schema.Dataset{}}
	for _, id := range []string{"r1", "r2"}[:1+d(0, 1)] {
		sketch := d.Sketch(id)
		fate := d(0, 11)
		if fate != 11 {
			p.base.Routes = append(p.base.Routes, sketch.Route(d, p.grid))
		}
		switch fate {
		case 9: // another route of the same name
			p.target.Routes = append(p.target.Routes, d.Sketch(id).Route(d, p.grid))
		case 10: // removed
		default:
			p.target.Routes = append(p.target.Routes, sketch.Edited(d).Route(d, p.grid))
		}
	}
	n := 1 + d(0, 2)
	var last schema.Train
	for i := range n {
		// Named against the order of the file, since results are by id.
		train := d.Train(fmt.Sprintf("t%d", n-i), 10*(i+1), p.grid)
		if i > 0 && d(0, 2) > 0 { // one that differs in one thing only from the train before
			train = alike(d, last, train)
		}
		last = train
		fate := d(0, 9)
		if fate != 9 {
			p.target.Trains = append(p.target.Trains, train)
		}
		switch fate {
		case 7:
			p.base.Trains = append(p.base.Trains, d.Train(train.ID, 10*(i+1), p.grid))
		case 8: // added
		default:
			p.base.Trains = append(p.base.Trains, train)
		}
	}
	return p
}

// alike gives a train that has the id of b and one property of b, else those of
// a.
func alike(d metre.Dice, a, b schema.Train) schema.Train {
	a.Pos, a.MaxPos, a.ID, a.Name = b.Pos, b.MaxPos, b.ID, b.Name
	switch d(0, 4) {
	case 0:
		a.Length = b.Length
	case 1:
		a.Max = b.Max
	case 2:
		a.Cant = b.Cant
	case 3:
		a.Categories = b.Categories
	case 4:
		a.AxleLoad = b.AxleLoad
	}
	return a
}

// check runs a property with the same draws each time, unless the flags of
// rapid ask for others.
func check(t *testing.T, checks int, property func(*rapid.T)) {
	for name, value := range map[string]string{"rapid.seed": "1", "rapid.checks": fmt.Sprint(checks), "rapid.nofailfile": "true"} {
		f := flag.Lookup(name)
		if old := f.Value.String(); old == f.DefValue {
			if err := f.Value.Set(value); err != nil {
				t.Fatal(err)
			}
			defer f.Value.Set(old)
		}
	}
	rapid.Check(t, property)
}

// The comparison of any two revisions is the one that the statement of the
// rules gives, cell by cell.
func TestCompareIsThatOfTheModel(t *testing.T) {
	seen := map[string]int{}
	check(t, 800, func(t *rapid.T) {
		p := drawPair(t)
		account, err := diff.Compare(context.Background(), p.base, p.target, diff.Options{})
		if err != nil {
			t.Fatal(err)
		}
		want := expected(p)
		got := observed(account)
		if d := slices.Compare(got, want); d != 0 {
			t.Fatalf("%sgot\n%s\nwant\n%s", show(p), strings.Join(got, "\n"), strings.Join(want, "\n"))
		}
		for _, line := range want {
			for _, word := range words {
				if strings.Contains(line, word) {
					seen[word]++
				}
			}
		}
		for _, r := range account.Routes {
			for _, c := range r.Changes {
				if r.Target.Track.Ends(c.From) != r.Target.Track.Begins(c.From) {
					seen[atJoint]++
				}
				for _, s := range r.Target.Track.Segments() {
					if c.From < s.Start && s.Start < c.To {
						seen[acrossJoint]++
					}
				}
			}
		}
	})
	// A draw that shows nothing proves nothing.
	for _, word := range append(words, atJoint, acrossJoint) {
		if seen[word] < 20 && !t.Failed() && !testing.Short() && flag.Lookup("rapid.checks").Value.String() == "100" {
			t.Errorf("%q was seen %d times only", word, seen[word])
		}
	}
	t.Log(seen)
}

// What the draws must show: parts of the lines of results, and changes at and
// across chainage jumps.
var words = []string{
	" change nominal", " change reverse", " masked", " added", " removed", " run-out", "; ", "basic", "cant deficiency", "passenger",
	"freight_p", " and ", "axle load", "temporary", "trains.toml",
}

const atJoint, acrossJoint = "begins at a joint", "runs across a joint"

// The pictures of the changes show the profiles of the model, and each change
// is in one of them.
func TestPicturesAreThoseOfTheModel(t *testing.T) {
	check(t, 300, func(t *rapid.T) {
		p := drawPair(t)
		account, err := diff.Compare(context.Background(), p.base, p.target, diff.Options{})
		if err != nil {
			t.Fatal(err)
		}
		type place struct{ route, change int }
		shown := map[place]int{}
		for _, s := range account.Stretches {
			r := &account.Routes[s.Route]
			cells, old := metre.Cells(r.Target.Track, p.grid), metre.Cells(r.Base.Track, p.grid)
			for _, i := range s.Trains {
				before := metre.Profile(r.Base, account.Trains[i].Train, s.Direction, metre.All, p.grid)
				after := metre.Profile(r.Target, account.Trains[i].Train, s.Direction, metre.All, p.grid)
				laid := make([]metre.Place, len(cells))
				for k, cell := range cells {
					if b := slices.Index(old, cell); b >= 0 {
						laid[k] = before[b]
					}
				}
				for side, want := range map[string][]metre.Place{"before": laid, "after": after} {
					steps := s.After
					if side == "before" {
						steps = s.Before
					}
					if problem := compareSteps(r, steps, want, s, p.grid); problem != "" {
						t.Fatalf("%strain %d, %s: %s", show(p), i, side, problem)
					}
				}
				for k, c := range r.Changes {
					if c.Train == i && c.Direction == s.Direction && s.From <= c.From && c.To <= s.To {
						shown[place{s.Route, k}]++
					}
				}
			}
		}
		for i := range account.Routes {
			for k, c := range account.Routes[i].Changes {
				if shown[place{i, k}] != 1 {
					t.Fatalf("%s%+v is in %d pictures", show(p), c, shown[place{i, k}])
				}
			}
		}
	})
}

// compareSteps says how steps differ from the places in the window; a place
// without speed is one that the side does not have.
func compareSteps(r *diff.Route, steps []diff.Step, places []metre.Place, s diff.Stretch, grid unit.Distance) string {
	for k, place := range places {
		at := unit.Distance(k) * grid
		i := slices.IndexFunc(steps, func(x diff.Step) bool { return x.From <= at && at < x.To })
		switch inside := at+grid > s.WindowFrom && at < s.WindowTo && place.Speed != 0; {
		case inside != (i >= 0):
			return fmt.Sprintf("at %s m there is a step: %t", at.M(), i >= 0)
		case !inside:
			continue
		case steps[i].Speed != place.Speed:
			return fmt.Sprintf("%d at %s m, want %d", steps[i].Speed, at.M(), place.Speed)
		}
		for _, source := range place.Sources {
			if !slices.ContainsFunc(r.Sources[steps[i].Sources], func(x profile.Source) bool { return x.Pos == source.Pos }) {
				return fmt.Sprintf("at %s m %v is not among the sources", at.M(), source)
			}
		}
	}
	return ""
}

// expected writes what the model finds, in the order of results.
func expected(p pair) []string {
	trains := slices.Clone(p.target.Trains)
	for _, old := range p.base.Trains {
		if !slices.ContainsFunc(trains, func(t schema.Train) bool { return t.ID == old.ID }) {
			trains = append(trains, old)
		}
	}
	slices.SortFunc(trains, func(a, b schema.Train) int { return strings.Compare(a.ID, b.ID) })
	var list []string
	for _, id := range []string{"r1", "r2"} {
		base, target := routeOf(p.base, id), routeOf(p.target, id)
		for _, d := range codes.AllDirections {
			before, after := base != nil && base.Directions.Has(d), target != nil && target.Directions.Has(d)
			switch {
			case before && after:
				for _, s := range metre.Only(base.Track, target.Track, p.grid) {
					list = append(list, track(id, "removed", d, s.From, s.To))
				}
				for _, s := range metre.Only(target.Track, base.Track, p.grid) {
					list = append(list, track(id, "added", d, s.From, s.To))
				}
			case before:
				list = append(list, track(id, "removed", d, 0, base.Track.Length()))
			case after:
				list = append(list, track(id, "added", d, 0, target.Track.Length()))
			}
		}
		if base == nil || target == nil {
			continue
		}
		list = append(list, expectedChanges("change", metre.Changes, p, base, target, trains)...)
		list = append(list, expectedChanges("masked", metre.Masked, p, base, target, trains)...)
	}
	return list
}

// finder is a part of the model that lists changes.
type finder func(base, target *schema.Route, train schema.Train, d codes.Direction, grid unit.Distance) []metre.Change

func expectedChanges(word string, find finder, p pair, base, target *schema.Route, trains []schema.Train) []string {
	type seen struct {
		metre.Change
		train string
	}
	var changes []seen
	for _, d := range codes.AllDirections {
		if !base.Directions.Has(d) || !target.Directions.Has(d) {
			continue
		}
		for _, t := range trains {
			for _, c := range find(base, target, t, d, p.grid) {
				changes = append(changes, seen{c, t.ID})
			}
		}
	}
	slices.SortStableFunc(changes, func(a, b seen) int {
		return cmp.Or(cmp.Compare(a.Direction, b.Direction), cmp.Compare(a.From, b.From))
	})
	texts := func(sources []metre.Source) (list []string) {
		for _, s := range sources {
			list = append(list, fmt.Sprint(s.Pos, " ", s.Kind, " ", s.Value))
		}
		return list
	}
	var list []string
	for _, c := range changes {
		list = append(list, change(base.ID, word, c.Direction, c.From, c.To, c.train, c.Before, c.After, c.RunOut, texts(c.BeforeSources), texts(c.AfterSources)))
	}
	return list
}

// observed writes an account in the same form.
func observed(a *diff.Account) []string {
	var list []string
	for _, r := range a.Routes {
		for _, s := range r.Track {
			list = append(list, track(r.ID, s.Fate.String(), s.Direction, s.From, s.To))
		}
		texts := func(sources []profile.Source) []string {
			sources = slices.Clone(sources)
			slices.SortFunc(sources, func(a, b profile.Source) int { return a.Pos.Compare(b.Pos) })
			var list []string
			for _, s := range sources {
				list = append(list, fmt.Sprint(s.Pos, " ", s.Kind, " ", s.Value))
			}
			return list
		}
		write := func(word string, changes []diff.Change) {
			for _, c := range changes {
				list = append(list, change(r.ID, word, c.Direction, c.From, c.To, a.Trains[c.Train].ID, c.Before, c.After, c.RunOut,
					texts(r.Sources[c.BeforeSources]), texts(r.Sources[c.AfterSources])))
			}
		}
		write("change", r.Changes)
		write("masked", r.Masked)
	}
	return list
}

func track(route, fate string, d codes.Direction, from, to unit.Distance) string {
	return fmt.Sprintf("%s %s %s %s to %s m", route, fate, d, from.M(), to.M())
}

func change(route, word string, d codes.Direction, from, to unit.Distance, train string, before, after unit.Speed, runOut bool, old, now []string) string {
	text := fmt.Sprintf("%s %s %s %s to %s m, %s: %d -> %d", route, word, d, from.M(), to.M(), train, before, after)
	if runOut {
		text += " run-out"
	}
	return text + " [" + strings.Join(old, "; ") + "] -> [" + strings.Join(now, "; ") + "]"
}

func routeOf(d *schema.Dataset, id string) *schema.Route {
	for _, r := range d.Routes {
		if r.ID == id {
			return r
		}
	}
	return nil
}

// show writes what was drawn, for the report of a failure.
func show(p pair) string {
	var b strings.Builder
	for i, d := range []*schema.Dataset{p.base, p.target} {
		name := [...]string{"base", "target"}[i]
		for _, t := range d.Trains {
			fmt.Fprintf(&b, "%s train %s: cant %d, categories %s, axle load %s, %s m, %d\n", name, t.ID, t.Cant.MM(), t.Categories, t.AxleLoad, t.Length.M(), t.Max)
		}
		for _, r := range d.Routes {
			fmt.Fprintf(&b, "%s route %s, %s, %s to %s, jumps %v\n%s", name, r.ID, r.Directions, r.Track.Begins(0), r.Track.Ends(r.Track.Length()), r.Jumps, metre.Rows(r))
		}
	}
	return b.String()
}
