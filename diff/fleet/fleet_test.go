package fleet

import (
	"cmp"
	"flag"
	"fmt"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/align"
	"speedtrail/diff/delta"
	"speedtrail/diff/internal/metre"
	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// drawn is two revisions of a route, in a direction that both have.
type drawn struct {
	dice         metre.Dice
	grid         unit.Distance
	base, target *schema.Route
	direction    codes.Direction
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

func diceOf(t *rapid.T) metre.Dice {
	return func(low, high int) int { return rapid.IntRange(low, high).Draw(t, "") }
}

func draw(t *rapid.T, grid unit.Distance) drawn {
	w := drawn{dice: diceOf(t), grid: grid}
	if grid == 0 {
		w.grid = w.dice.Grid()
	}
	sketch := w.dice.Sketch("r")
	w.base = sketch.Route(w.dice, w.grid)
	w.target = sketch.Edited(w.dice).Route(w.dice, w.grid)
	return w.directed(t)
}

func (w drawn) directed(t *rapid.T) drawn {
	w.direction = codes.Direction(w.dice(0, 1))
	common := w.base.Directions & w.target.Directions
	if !common.Has(w.direction) {
		w.direction = 1 - w.direction
	}
	if !common.Has(w.direction) {
		t.Skip("no direction that both have")
	}
	return w
}

func (w drawn) compare(filter profile.Filter, lengths ...unit.Distance) Result {
	return Compare(profile.New(w.base, w.direction, filter), profile.New(w.target, w.direction, filter), w.direction, w.cells(), lengths)
}

func (w drawn) cells() []align.Cell { return align.Tracks(w.base.Track, w.target.Track).Common }

// String writes what was drawn, for the report of a failure.
func (w drawn) String() string {
	text := w.direction.String() + "\n"
	for i, r := range []*schema.Route{w.base, w.target} {
		text += fmt.Sprintf("%s %s to %s, jumps %v\n%s", [...]string{"base", "target"}[i], r.Track.Begins(0), r.Track.Ends(r.Track.Length()), r.Jumps, metre.Rows(r))
	}
	return text
}

// everyClass lists the 11 x 8 x 13 classes that the standard can describe
// (SUBSET-026 7.5.1).
func everyClass() []profile.Class {
	var list []profile.Class
	for cant := range 11 {
		for set := range 8 {
			for axle := range 13 {
				list = append(list, profile.Class{Cant: codes.CantDeficiency(cant), Categories: codes.CategorySet(set), AxleLoad: codes.AxleLoad(axle)})
			}
		}
	}
	return list
}

// bySelection does the work once for classes that all rows treat alike.
func bySelection[T any](compilers [2]*profile.Compiler, work func(before, after profile.Selection) T) func(profile.Class) T {
	done := map[string]T{}
	return func(c profile.Class) T {
		before, after := compilers[0].Select(c), compilers[1].Select(c)
		key := fmt.Sprint(before, after)
		x, ok := done[key]
		if !ok {
			x = work(before, after)
			done[key] = x
		}
		return x
	}
}

// seenBy lists the changes that a class and length sees by an account, each
// once however many products hold the class.
func seenBy(r Result, c profile.Class, length unit.Distance) []delta.Delta {
	var list []delta.Delta
	for _, x := range r.Changes {
		if x.TrainLength == length && slices.ContainsFunc(x.Products, func(p Product) bool { return p.Has(c) }) {
			list = append(list, x.Delta)
		}
	}
	return list
}

// The products of an account, written out, are what each of the 1,144 classes
// sees that is compiled by itself, with and without temporary restrictions.
func TestChangesAreThoseOfEveryClass(t *testing.T) {
	several, overlapping, shared := 0, 0, 0
	check(t, 100, func(t *rapid.T) {
		w := draw(t, 0)
		short, long := unit.Distance(w.dice(1, 8))*w.grid, unit.Distance(w.dice(9, 25))*w.grid
		filter := [...]profile.Filter{profile.All, profile.NoTemporary}[w.dice(0, 1)]
		r := w.compare(filter, short, long)
		checkOrder(t, r, short, long)
		cells := w.cells()
		sides := [2]*profile.Compiler{profile.New(w.base, w.direction, filter), profile.New(w.target, w.direction, filter)}
		for _, length := range []unit.Distance{short, long} {
			compiled := bySelection(sides, func(before, after profile.Selection) []delta.Delta {
				found := delta.Between(sides[0].Sweep(before, length, profile.NoMaximum), sides[1].Sweep(after, length, profile.NoMaximum), cells)
				return delta.MarkRunOut(found, sides[0].Sweep(before, 0, profile.NoMaximum), sides[1].Sweep(after, 0, profile.NoMaximum))
			})
			for _, c := range everyClass() {
				if got, want := seenBy(r, c, length), compiled(c); !slices.Equal(got, want) {
					t.Fatalf("%vclass %+v, %s m: %+v, want %+v", w, c, length.M(), got, want)
				}
			}
		}
		for _, x := range r.Changes {
			covered, size := classSet{}, 0
			for _, p := range x.Products {
				if p.Size() == 0 {
					t.Fatalf("%vempty product %+v of %+v", w, p, x)
				}
				covered.join(setOf(p))
				size += p.Size()
			}
			if len(x.Products) > 1 {
				several++
			}
			if size > count(&covered) {
				overlapping++
			}
			if size < len(everyClass()) {
				shared++
			}
		}
	})
	// A draw that shows nothing proves nothing.
	if !t.Failed() && !testing.Short() && flag.Lookup("rapid.checks").Value.String() == "100" && (several < 50 || shared < 100) {
		t.Errorf("of the changes %d only have several products, %d are not seen by all", several, shared)
	}
	t.Logf("%d changes with several products, %d of them with products that overlap; %d not seen by all", several, overlapping, shared)
}

// checkOrder checks that changes are by length as asked for, then position,
// then speeds, and that none stands there twice.
func checkOrder(t *rapid.T, r Result, lengths ...unit.Distance) {
	order := func(a, b Change) int {
		return cmp.Or(cmp.Compare(slices.Index(lengths, a.TrainLength), slices.Index(lengths, b.TrainLength)), cmp.Compare(a.Target, b.Target),
			cmp.Compare(a.Length, b.Length), cmp.Compare(a.Before, b.Before), cmp.Compare(a.After, b.After))
	}
	for i, x := range r.Changes {
		if i > 0 && order(r.Changes[i-1], x) > 0 {
			t.Fatalf("%+v does not come after %+v", x, r.Changes[i-1])
		}
		for _, y := range r.Changes[:i] {
			if x.TrainLength == y.TrainLength && x.Delta == y.Delta {
				t.Fatalf("%+v is listed twice", x)
			}
		}
	}
}

// What classes see by an account is what the statement of the rules gives,
// cell by cell, which knows no selections and no sweeps.
func TestChangesAreThoseOfTheModel(t *testing.T) {
	changes := 0
	check(t, 300, func(t *rapid.T) {
		w := draw(t, 0)
		length := unit.Distance(w.dice(1, 25)) * w.grid
		filter, base, target := profile.All, *w.base, *w.target
		if w.dice(0, 1) == 1 {
			filter, base.Temporary, target.Temporary = profile.NoTemporary, nil, nil
		}
		r := w.compare(filter, length)
		for range 4 {
			train := w.dice.Train("t", 7, w.grid)
			train.Length, train.Max = length, profile.NoMaximum
			want := metre.Changes(&base, &target, train, w.direction, w.grid)
			got := seenBy(r, profile.ClassOf(train), length)
			same := slices.EqualFunc(got, want, func(d delta.Delta, c metre.Change) bool {
				return d.Target == c.From && d.Target+d.Length == c.To && d.Before == c.Before && d.After == c.After && d.RunOut == c.RunOut
			})
			if !same {
				t.Fatalf("%vtrain %+v: %+v, want %+v", w, train, got, want)
			}
			changes += len(want)
		}
	})
	if !t.Failed() && !testing.Short() && changes < 300 {
		t.Errorf("only %d changes were drawn", changes)
	}
}

// setOf writes out a product.
func setOf(p Product) *classSet {
	s := new(classSet)
	for _, c := range everyClass() {
		if p.Has(c) {
			s[c.Cant][c.Categories] |= 1 << c.AxleLoad
		}
	}
	return s
}

// count counts the classes of a set.
func count(s *classSet) (n int) {
	for _, c := range everyClass() {
		n += int(s[c.Cant][c.Categories] >> c.AxleLoad & 1)
	}
	return n
}
