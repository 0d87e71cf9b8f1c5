package align_test

import (
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/align"
	"speedtrail/schema/chainage"
	"speedtrail/schema/unit"
)

const km = unit.Kilometre

func track(t *testing.T, start, end unit.Distance, jumps ...chainage.Jump) *chainage.Track {
	t.Helper()
	tr, err := chainage.NewTrack(start, end, jumps)
	if err != nil {
		t.Fatal(err)
	}
	return tr
}

// Laid side by side by hand.
func TestTracks(t *testing.T) {
	plain := track(t, 0, 10*km)
	missing := track(t, 0, 10*km, chainage.Jump{Arriving: 4 * km, Leaving: 5 * km})
	repeated := track(t, 0, 10*km, chainage.Jump{Arriving: 6 * km, Leaving: 5 * km})
	tests := []struct {
		name         string
		base, target *chainage.Track
		want         align.Alignment
	}{
		{"the same", plain, plain, align.Alignment{Common: []align.Cell{{0, 0, 10 * km}}}},
		{"the same jump on both sides is no break", missing, missing, align.Alignment{Common: []align.Cell{{0, 0, 9 * km}}}},
		{"posts that go", plain, missing, align.Alignment{Common: []align.Cell{{0, 0, 4 * km}, {5 * km, 4 * km, 5 * km}}, Removed: []align.Interval{{4 * km, 5 * km}}}},
		{"posts that come", missing, plain, align.Alignment{Common: []align.Cell{{0, 0, 4 * km}, {4 * km, 5 * km, 5 * km}}, Added: []align.Interval{{4 * km, 5 * km}}}},
		// The second kilometre that reads 5 to 6 is the new one.
		{"posts that begin to repeat", plain, repeated, align.Alignment{Common: []align.Cell{{0, 0, 6 * km}, {6 * km, 7 * km, 4 * km}}, Added: []align.Interval{{6 * km, 7 * km}}}},
		{"posts that repeat no more", repeated, plain, align.Alignment{Common: []align.Cell{{0, 0, 6 * km}, {7 * km, 6 * km, 4 * km}}, Removed: []align.Interval{{6 * km, 7 * km}}}},
		{"a longer route", plain, track(t, -2*km, 11*km), align.Alignment{Common: []align.Cell{{0, 2 * km, 10 * km}}, Added: []align.Interval{{0, 2 * km}, {12 * km, 13 * km}}}},
		{"a route elsewhere", plain, track(t, 20*km, 21*km), align.Alignment{Added: []align.Interval{{0, km}}, Removed: []align.Interval{{0, 10 * km}}}},
	}
	for _, x := range tests {
		t.Run(x.name, func(t *testing.T) {
			got := align.Tracks(x.base, x.target)
			if !slices.Equal(got.Common, x.want.Common) || !slices.Equal(got.Added, x.want.Added) || !slices.Equal(got.Removed, x.want.Removed) {
				t.Errorf("got %v, want %v", got, x.want)
			}
			whole := len(x.want.Added)+len(x.want.Removed) == 0
			if got.Whole() != whole {
				t.Errorf("whole: %t", got.Whole())
			}
		})
	}
}

// drawTrack draws a track of even chainages.
func drawTrack(t *rapid.T) *chainage.Track {
	even := func(low, high int) unit.Distance {
		return unit.Distance(2 * rapid.IntRange(low, high).Draw(t, "km"))
	}
	start := even(0, 4)
	at := start
	var jumps []chainage.Jump
	for range rapid.IntRange(0, 3).Draw(t, "jumps") {
		j := chainage.Jump{Arriving: at + 2 + even(0, 4)}
		j.Leaving = j.Arriving + even(-3, 3)
		jumps = append(jumps, j)
		at = j.Leaving
	}
	tr, err := chainage.NewTrack(start, at+2+even(0, 5), jumps)
	if err != nil {
		t.Skip(err)
	}
	return tr
}

// What one millimetre of a track reads, and for the how manieth time.
type reading struct {
	chainage unit.Distance
	nth      int
}

func readings(tr *chainage.Track) []reading {
	seen := map[unit.Distance]int{}
	var list []reading
	for _, s := range tr.Segments() {
		for at := s.From; at < s.To; at++ {
			list = append(list, reading{at, seen[at]})
			seen[at]++
		}
	}
	return list
}

// Millimetre by millimetre: the cells and intervals of a side cover its track once,
// in order; cells hold what both sides read, and no cell goes on in the next.
func TestTracksPointByPoint(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		base, target := drawTrack(t), drawTrack(t)
		a := align.Tracks(base, target)
		old, now := readings(base), readings(target)
		coveredOld, coveredNow := make([]int, len(old)), make([]int, len(now))
		for i, c := range a.Common {
			if c.Length <= 0 || i > 0 && (a.Common[i-1].Continues(c) || c.Target < a.Common[i-1].Target) {
				t.Fatalf("cells %v", a.Common)
			}
			for s := range c.Length {
				if old[c.Base+s] != now[c.Target+s] {
					t.Fatalf("%v on the base is %v on the target, cells %v", old[c.Base+s], now[c.Target+s], a.Common)
				}
				coveredOld[c.Base+s]++
				coveredNow[c.Target+s]++
			}
		}
		for _, side := range []struct {
			list    []align.Interval
			own     []reading
			others  []reading
			covered []int
		}{{a.Removed, old, now, coveredOld}, {a.Added, now, old, coveredNow}} {
			last := unit.Distance(-1)
			for _, x := range side.list {
				if x.From <= last || x.To <= x.From {
					t.Fatalf("intervals %v", side.list)
				}
				last = x.To
				for s := x.From; s < x.To; s++ {
					if slices.Contains(side.others, side.own[s]) {
						t.Fatalf("both sides read %v", side.own[s])
					}
					side.covered[s]++
				}
			}
			for s, n := range side.covered {
				if n != 1 {
					t.Fatalf("%v is covered %d times by %v and %v", side.own[s], n, a.Common, side.list)
				}
			}
		}
		if a.Whole() != slices.Equal(old, now) {
			t.Fatalf("whole: %t, %v and %v", a.Whole(), old, now)
		}
	})
}

// Point by point: a union holds what one of its intervals holds, in order and with
// gaps between; and it touches a stretch where one of them has a part of it.
func TestUnion(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		number := func(least int) unit.Distance { return unit.Distance(rapid.IntRange(least, 20).Draw(t, "at")) }
		var list []align.Interval
		for range rapid.IntRange(0, 6).Draw(t, "intervals") {
			from := number(0)
			list = append(list, align.Interval{From: from, To: from + number(1)})
		}
		in := func(list []align.Interval, s unit.Distance) bool {
			return slices.ContainsFunc(list, func(x align.Interval) bool { return x.From <= s && s < x.To })
		}
		union := align.Union(slices.Clone(list))
		for i, x := range union {
			if x.To <= x.From || i > 0 && x.From <= union[i-1].To {
				t.Fatalf("%v of %v", union, list)
			}
		}
		from := number(0)
		to := from + number(1)
		touches := false
		for s := range unit.Distance(50) {
			if in(union, s) != in(list, s) {
				t.Fatalf("%v of %v at %d", union, list, s)
			}
			touches = touches || from <= s && s < to && in(list, s)
		}
		if got := align.Touches(union, from, to); got != touches {
			t.Fatalf("%v touches %d to %d: %t", union, from, to, got)
		}
	})
}
