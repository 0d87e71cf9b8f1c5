package diff

import (
	"flag"
	"fmt"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/align"
	"speedtrail/diff/fleet"
	"speedtrail/diff/internal/metre"
	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// drawFleet draws two revisions of a route and reference trains.
func drawFleet(t *rapid.T) (d metre.Dice, grid unit.Distance, base, target *schema.Route, trains []schema.Train) {
	d = func(low, high int) int { return rapid.IntRange(low, high).Draw(t, "") }
	grid = d.Grid()
	sketch := d.Sketch("r")
	base, target = sketch.Route(d, grid), sketch.Edited(d).Route(d, grid)
	for i := range d(1, 3) {
		trains = append(trains, d.Train(fmt.Sprint("t", i), 10*i, grid))
	}
	return d, grid, base, target, trains
}

// checkFleet runs a property with the same draws each time, unless the flags
// of rapid ask for others.
func checkFleet(t *testing.T, checks int, property func(*rapid.T)) {
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

// modelChanges lists what a train sees by the statement of the rules.
func modelChanges(base, target *schema.Route, train schema.Train, d codes.Direction, permanent bool, grid unit.Distance) []metre.Change {
	b, a := *base, *target
	if permanent {
		b.Temporary, a.Temporary = nil, nil
	}
	return metre.Changes(&b, &a, train, d, grid)
}

// A product is represented if a reference train of its categories changes on a
// part of the same place, in the same direction and sense; and not if none
// changes anywhere on the same connected stretch. In between, its length may
// carry the change elsewhere.
func TestRepresentedIsByAReferenceTrain(t *testing.T) {
	for name, permanent := range map[string]bool{"with temporary restrictions": false, "without": true} {
		t.Run(name, func(t *testing.T) {
			seen := map[string]int{}
			checkFleet(t, 600, func(t *rapid.T) {
				_, grid, base, target, trains := drawFleet(t)
				for _, f := range fleetOf(t, base, target, trains...).Fleet {
					if f.Permanent != permanent {
						continue
					}
					for _, c := range f.Changes {
						for k, p := range c.Products {
							here, near := stoodFor(&f, c, p, base, target, trains, grid)
							if got := c.Represented[k]; got && !near || !got && here {
								t.Fatalf("%s %+v, %s: represented %t; on the place %t, on the stretch %t\ntrains %+v\nbase\n%starget\n%s",
									f.Direction, c, p, got, here, near, trains, metre.Rows(base), metre.Rows(target))
							}
							seen[fmt.Sprintf("here %t near %t: %t", here, near, c.Represented[k])]++
						}
					}
				}
			})
			t.Log(seen)
			for _, word := range []string{"here true near true: true", "here false near true: true", "here false near true: false", "here false near false: false"} {
				if !t.Failed() && !testing.Short() && seen[word] < 3 {
					t.Errorf("%s was seen %d times only", word, seen[word])
				}
			}
		})
	}
}

// stoodFor tells whether a reference train of the product changes in the sense
// of c on a part of its place, and whether on the stretch of the reach.
func stoodFor(f *Fleet, c FleetChange, p fleet.Product, base, target *schema.Route, trains []schema.Train, grid unit.Distance) (here, near bool) {
	i := slices.IndexFunc(f.Reach, func(r align.Interval) bool { return r.From <= c.Target && c.Target+c.Length <= r.To })
	for _, train := range trains {
		if i < 0 || !p.Has(profile.ClassOf(train)) {
			continue
		}
		for _, x := range modelChanges(base, target, train, f.Direction, f.Permanent, grid) {
			if (x.After > x.Before) == (c.After > c.Before) {
				here = here || x.From < c.Target+c.Length && c.Target < x.To
				near = near || x.From < f.Reach[i].To && f.Reach[i].From < x.To
			}
		}
	}
	return here, near
}

// The account gives what any train as long as the shortest or the longest
// reference train sees; what it sees without temporary restrictions is there,
// too, unless it is the same.
func TestFleetIsThatOfTheModel(t *testing.T) {
	permanently := 0
	checkFleet(t, 300, func(t *rapid.T) {
		d, grid, base, target, trains := drawFleet(t)
		byLength := func(a, b schema.Train) int { return int(a.Length - b.Length) }
		lengths := []unit.Distance{slices.MinFunc(trains, byLength).Length, slices.MaxFunc(trains, byLength).Length}
		list := fleetOf(t, base, target, trains...).Fleet
		for _, direction := range codes.AllDirections {
			if !base.Directions.Has(direction) || !target.Directions.Has(direction) {
				continue
			}
			for range 3 {
				train := d.Train("x", 99, grid)
				train.Length, train.Max = lengths[d(0, 1)], profile.NoMaximum
				seen := [2][]metre.Change{}
				for _, f := range list {
					if f.Direction != direction {
						continue
					}
					k := map[bool]int{true: 1}[f.Permanent]
					permanently += k
					if f.Shortest != lengths[0] || f.Longest != lengths[1] {
						t.Fatalf("account for %s to %s m, want %v", f.Shortest.M(), f.Longest.M(), lengths)
					}
					for _, c := range f.Changes {
						if slices.Contains(c.Lengths, train.Length) && slices.ContainsFunc(c.Products, func(p fleet.Product) bool { return p.Has(profile.ClassOf(train)) }) {
							seen[k] = append(seen[k], metre.Change{From: c.Target, To: c.Target + c.Length, Before: c.Before, After: c.After, RunOut: c.RunOut})
						}
					}
				}
				same := func(a, b metre.Change) bool {
					return a.From == b.From && a.To == b.To && a.Before == b.Before && a.After == b.After && a.RunOut == b.RunOut
				}
				want := modelChanges(base, target, train, direction, false, grid)
				if !slices.EqualFunc(seen[0], want, same) {
					t.Fatalf("%s, train %+v: %+v, want %+v\nbase\n%starget\n%s", direction, train, seen[0], want, metre.Rows(base), metre.Rows(target))
				}
				want = modelChanges(base, target, train, direction, true, grid)
				in := func(list []metre.Change) func(metre.Change) bool {
					return func(c metre.Change) bool {
						return slices.ContainsFunc(list, func(x metre.Change) bool { return same(x, c) })
					}
				}
				for _, c := range seen[1] {
					if !in(want)(c) {
						t.Fatalf("%s, train %+v: %+v is not seen without temporary restrictions", direction, train, c)
					}
				}
				for _, c := range want {
					if !in(slices.Concat(seen[0], seen[1]))(c) {
						t.Fatalf("%s, train %+v: %+v without temporary restrictions is missing", direction, train, c)
					}
				}
			}
		}
	})
	if !t.Failed() && !testing.Short() && permanently < 50 {
		t.Errorf("only %d accounts without temporary restrictions", permanently)
	}
}
