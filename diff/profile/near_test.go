package profile_test

import (
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/align"
	"speedtrail/diff/internal/metre"
	"speedtrail/diff/profile"
	"speedtrail/diff/step"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// narrowed is two revisions of a route with the same track, and trains.
type narrowed struct {
	base, target *schema.Route
	trains       []schema.Train
	longest      unit.Distance
}

func drawNarrowed(t *rapid.T) narrowed {
	d := metre.Dice(func(low, high int) int { return rapid.IntRange(low, high).Draw(t, "") })
	grid := d.Grid()
	sketch := d.Sketch("r")
	w := narrowed{base: sketch.Route(d, grid), target: sketch.Edited(d).Route(d, grid)}
	tracks := align.Tracks(w.base.Track, w.target.Track)
	if !tracks.Whole() {
		t.Skip("the tracks differ")
	}
	for range 3 {
		w.trains = append(w.trains, d.Train("t", 1, grid))
	}
	for _, train := range w.trains {
		w.longest = max(w.longest, train.Length)
	}
	return w
}

// The narrow compilers give inside what the whole ones give, for every train up
// to the longest; outside, the whole ones give the same for both sides.
func TestNarrow(t *testing.T) {
	inside, outside := 0, 0
	rapid.Check(t, func(t *rapid.T) {
		w := drawNarrowed(t)
		for _, d := range codes.AllDirections {
			for _, filter := range []profile.Filter{profile.All, profile.NoTemporary} {
				base, target := profile.New(w.base, d, filter), profile.New(w.target, d, filter)
				b, a, near := profile.Narrow(base, target, w.longest)
				if len(near) > 0 && (near[0].From < 0 || near[len(near)-1].To > w.base.Track.Length()) {
					t.Fatalf("%v lies outside the route", near)
				}
				for _, train := range w.trains {
					for _, length := range []unit.Distance{0, train.Length} {
						train.Length = length
						before, after := base.Compile(train), target.Compile(train)
						narrowBefore, narrowAfter := b.Compile(train), a.Compile(train)
						for at := unit.Distance(0); at < w.base.Track.Length(); {
							is := slices.ContainsFunc(near, func(i align.Interval) bool { return i.From <= at && at < i.To })
							switch {
							case is && (before.At(at) != narrowBefore.At(at) || after.At(at) != narrowAfter.At(at)):
								t.Fatalf("%v at %d: %d, %d, narrow %d, %d", d, at, before.At(at), after.At(at), narrowBefore.At(at), narrowAfter.At(at))
							case !is && before.At(at) != after.At(at):
								t.Fatalf("%v at %d: %d, %d, outside %v", d, at, before.At(at), after.At(at), near)
							case is:
								inside++
							default:
								outside++
							}
							at = nextPlace(at, w.base.Track.Length(), near, before, after, narrowBefore, narrowAfter)
						}
					}
				}
			}
		}
	})
	if !testing.Short() && (inside < 1000 || outside < 1000) {
		t.Errorf("looked at %d pieces inside and %d outside", inside, outside)
	}
}

// A window gives inside what the whole compiler gives, with the same sources.
func TestWindow(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		w := drawNarrowed(t)
		length := int64(w.base.Track.Length())
		from := unit.Distance(rapid.Int64Range(0, length-1).Draw(t, "from"))
		to := unit.Distance(rapid.Int64Range(int64(from)+1, length).Draw(t, "to"))
		for _, d := range codes.AllDirections {
			c := profile.New(w.base, d, profile.All)
			window := c.Window(from, to, w.longest)
			for _, train := range w.trains {
				class := profile.ClassOf(train)
				f, g := c.Compile(train), window.Compile(train)
				for at := from; at < to; at = nextPlace(at, to, nil, f, g) {
					v := f.At(at)
					if g.At(at) != v {
						t.Fatalf("%v at %d: %d, in the window %d", d, at, v, g.At(at))
					}
					sources := func(c *profile.Compiler) (list []profile.Source) {
						for _, row := range c.Governing(c.Select(class), train.Length, train.Max, at, at+1, v) {
							list = append(list, c.Source(row, train))
						}
						return list
					}
					if !slices.Equal(sources(c), sources(window)) {
						t.Fatalf("%v at %d: %v, in the window %v", d, at, sources(c), sources(window))
					}
				}
			}
		}
	})
}

// Permanent is New without temporary restrictions.
func TestPermanent(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		w := drawNarrowed(t)
		for _, d := range codes.AllDirections {
			got, want := profile.New(w.base, d, profile.All).Permanent(), profile.New(w.base, d, profile.NoTemporary)
			if got.HasTemporary() {
				t.Fatal("a temporary restriction is left")
			}
			for _, train := range w.trains {
				if !slices.Equal(got.Compile(train), want.Compile(train)) {
					t.Fatalf("%v: %v, want %v", d, got.Compile(train), want.Compile(train))
				}
			}
		}
	})
}

// nextPlace gives the next place at which anything can be another.
func nextPlace(at, end unit.Distance, near []align.Interval, profiles ...step.Func) unit.Distance {
	next := end
	for _, f := range profiles {
		for _, p := range f {
			if p.To > at {
				next = min(next, p.To)
				break
			}
		}
	}
	for _, i := range near {
		for _, limit := range [...]unit.Distance{i.From, i.To} {
			if limit > at {
				next = min(next, limit)
			}
		}
	}
	return next
}
