package profile_test

import (
	"flag"
	"fmt"
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/internal/metre"
	"speedtrail/diff/profile"
	"speedtrail/diff/step"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// drawn is a route, a train and a direction that the route is used in.
type drawn struct {
	dice      metre.Dice
	grid      unit.Distance
	route     *schema.Route
	direction codes.Direction
	train     schema.Train
}

func draw(t *rapid.T) drawn {
	d := metre.Dice(func(low, high int) int { return rapid.IntRange(low, high).Draw(t, "") })
	w := drawn{dice: d, grid: d.Grid()}
	// An edited sketch has rows that continue others, too.
	w.route = d.Sketch("r").Edited(d).Route(d, w.grid)
	w.direction = codes.Direction(d(0, 1))
	if !w.route.Directions.Has(w.direction) {
		w.direction = 1 - w.direction
	}
	w.train = d.Train("t", 7, w.grid)
	return w
}

func (w drawn) compile() step.Func {
	return profile.New(w.route, w.direction, profile.All).Compile(w.train)
}

// String writes what was drawn, for the report of a failure.
func (w drawn) String() string {
	return fmt.Sprintf("%s, train: cant %d, categories %s, axle load %s, %s m, %d\n%s", w.direction,
		w.train.Cant.MM(), w.train.Categories, w.train.AxleLoad, w.train.Length.M(), w.train.Max, metre.Rows(w.route))
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

// A profile has the speed of the model in every cell, and its pieces the rows
// of the model as sources; with each filter of temporary restrictions.
func TestProfileIsThatOfTheModel(t *testing.T) {
	check(t, 1000, func(t *rapid.T) {
		w := draw(t)
		filter := [...]profile.Filter{profile.All, profile.NoTemporary, func(r *schema.TemporaryRow) bool { return r.ID != "T0" }}[w.dice(0, 2)]
		c := profile.New(w.route, w.direction, filter)
		f := c.Compile(w.train)
		layers := metre.All
		layers.Temporary = filter
		want := metre.Profile(w.route, w.train, w.direction, layers, w.grid)
		for i, place := range want {
			// A point belongs to the piece that begins there in nominal order.
			s := unit.Distance(i) * w.grid
			for _, at := range [...]unit.Distance{s, s + w.grid/2, s + w.grid - 1} {
				if got := f.At(at); got != place.Speed {
					t.Fatalf("%v%d at %s m, want %d", w, got, at.M(), place.Speed)
				}
			}
		}
		if got, last := f.At(w.route.Track.Length()), want[len(want)-1].Speed; got != last {
			t.Fatalf("%v%d at the end, want %d", w, got, last)
		}
		checkPieces(t, w, f)
		sel := c.Select(profile.ClassOf(w.train))
		for i, g := range c.Profile(w.train) {
			if g.Piece != f[i] {
				t.Fatalf("%vpiece %v with sources is not %v", w, g.Piece, f[i])
			}
			checkSources(t, w, g.Sources, want, g.From, g.To)
			// A part of a piece has the sources that hold there.
			first, last := int(g.From/w.grid), int(g.To/w.grid)-1
			from := w.dice(first, last)
			to := w.dice(from, last) + 1
			var part []profile.Source
			for _, row := range c.Governing(sel, w.train.Length, w.train.Max, unit.Distance(from)*w.grid, unit.Distance(to)*w.grid, g.Speed) {
				part = append(part, c.Source(row, w.train))
			}
			checkSources(t, w, part, want, unit.Distance(from)*w.grid, unit.Distance(to)*w.grid)
		}
	})
}

// checkPieces checks the law of step.Func, and that the route is covered.
func checkPieces(t *rapid.T, w drawn, f step.Func) {
	at := unit.Distance(0)
	for i, p := range f {
		if p.From != at || p.To <= p.From || i > 0 && f[i-1].Speed == p.Speed {
			t.Fatalf("%vpieces are not maximal and without gaps: %v", w, f)
		}
		at = p.To
	}
	if at != w.route.Track.Length() {
		t.Fatalf("%vthe profile ends at %s m: %v", w, at.M(), f)
	}
}

// fataler is what ends a check, of a property or of a fuzz target.
type fataler interface{ Fatalf(string, ...any) }

// checkSources compares with the places of the model from from to to, and
// checks the order: that of the track (start, end, layer, line), the train last.
func checkSources(t fataler, w drawn, got []profile.Source, places []metre.Place, from, to unit.Distance) {
	place := map[source.Position][4]int{w.train.MaxPos: {math.MaxInt}}
	add := func(layer int, r schema.Row) { place[r.Pos] = [4]int{int(r.Start), int(r.End), layer, r.Pos.Line} }
	for _, r := range w.route.Speed {
		add(0, r.Row)
	}
	for _, r := range w.route.AxleLoad {
		add(1, r.Row)
	}
	for _, r := range w.route.Temporary {
		add(2, r.Row)
	}
	if !slices.IsSortedFunc(got, func(a, b profile.Source) int {
		x, y := place[a.Pos], place[b.Pos]
		return slices.Compare(x[:], y[:])
	}) {
		t.Fatalf("%vsources are not in the order of the track: %v", w, got)
	}
	var have, want []string
	for _, s := range got {
		have = append(have, fmt.Sprint(s.Pos, " ", s.Kind, " ", s.Value))
	}
	for _, p := range places[from/w.grid : to/w.grid] {
		for _, s := range p.Sources {
			want = append(want, fmt.Sprint(s.Pos, " ", s.Kind, " ", s.Value))
		}
	}
	slices.Sort(have)
	slices.Sort(want)
	if want = slices.Compact(want); !slices.Equal(have, want) {
		t.Fatalf("%ssources %q from %s to %s m, want %q", w, have, from.M(), to.M(), want)
	}
}

// SUBSET-026 3.11.2.3, 3.13.7: the result is nowhere above a layer, and equals
// one of them; 3.11.8: the maximum speed is one.
func TestResultIsTheLowestLayer(t *testing.T) {
	check(t, 500, func(t *rapid.T) {
		w := draw(t)
		whole := w.compile()
		var layers []step.Func
		for i := range 3 {
			one := w
			route := *w.route
			one.route = &route
			one.train.Max = profile.NoMaximum
			if i != 0 {
				route.Speed = nil
			}
			if i != 1 {
				route.AxleLoad = nil
			}
			if i != 2 {
				route.Temporary = nil
			}
			layers = append(layers, one.compile())
		}
		for s := unit.Distance(0); s < w.route.Track.Length(); s += w.grid {
			lowest := w.train.Max
			for _, f := range layers {
				lowest = min(lowest, f.At(s))
			}
			if got := whole.At(s); got != lowest {
				t.Fatalf("%v%d at %s m, the lowest layer has %d", w, got, s.M(), lowest)
			}
		}
	})
}

// Adding a restriction raises the speed nowhere, lowers it at most to its own
// value, and only where it can hold.
func TestAddingARestrictionNeverRaises(t *testing.T) {
	check(t, 500, func(t *rapid.T) {
		w := draw(t)
		old := w.compile()
		route := *w.route
		w.route = &route
		cells := int(route.Track.Length() / w.grid)
		from := w.dice(0, cells-1)
		to := w.dice(from+1, cells)
		row := schema.TemporaryRow{ID: "new", Speed: 5 * unit.Speed(w.dice(1, 40))}
		row.Start, row.End, row.Directions, row.Delay = unit.Distance(from)*w.grid, unit.Distance(to)*w.grid, codes.Both, w.dice(0, 1) == 1
		route.Temporary = append(slices.Clone(route.Temporary), row)
		now := w.compile()
		start, end := row.Start, row.End
		switch {
		case row.Delay && w.direction == codes.Reverse:
			start -= w.train.Length
		case row.Delay:
			end += w.train.Length
		}
		for s := unit.Distance(0); s < route.Track.Length(); s += w.grid {
			want := old.At(s)
			if s >= start && s < end {
				want = min(want, row.Speed)
			}
			if now.At(s) != want {
				t.Fatalf("%v%d -> %d at %s m", w, old.At(s), now.At(s), s.M())
			}
		}
	})
}

// A longer train is nowhere faster; with no delays the length does not matter.
func TestLength(t *testing.T) {
	check(t, 500, func(t *rapid.T) {
		w := draw(t)
		long := w
		long.train.Length += unit.Distance(w.dice(1, 10)) * w.grid
		short, longer := w.compile(), long.compile()
		for s := unit.Distance(0); s < w.route.Track.Length(); s += w.grid {
			if longer.At(s) > short.At(s) {
				t.Fatalf("%vthe longer train has %d at %s m, the shorter %d", w, longer.At(s), s.M(), short.At(s))
			}
		}
		route := withDelay(w.route, false)
		w.route, long.route = route, route
		if a, b := w.compile(), long.compile(); !slices.Equal(a, b) {
			t.Fatalf("%vno delay, but %v and %v for lengths %s and %s m", w, a, b, w.train.Length.M(), long.train.Length.M())
		}
		if profile.New(route, w.direction, profile.All).Delayed() {
			t.Fatalf("%vno delay, but Delayed", w)
		}
	})
}

// withDelay copies a route with train length delay on every row, or on none.
func withDelay(r *schema.Route, delay bool) *schema.Route {
	c := *r
	c.Speed, c.AxleLoad, c.Temporary = slices.Clone(r.Speed), slices.Clone(r.AxleLoad), slices.Clone(r.Temporary)
	for i := range c.Speed {
		c.Speed[i].Delay = delay
	}
	for i := range c.AxleLoad {
		c.AxleLoad[i].Delay = delay
	}
	for i := range c.Temporary {
		c.Temporary[i].Delay = delay
	}
	return &c
}

// A delay moves rises only: in the direction of travel, each fall lies where
// it does without delays, and falls to the same speed; with a delay on every
// row, a rise lies one train length past a rise.
func TestDelayMovesRisesOnly(t *testing.T) {
	check(t, 500, func(t *rapid.T) {
		w := draw(t)
		plain := w
		plain.route = withDelay(w.route, false)
		undelayed := steps(plain.compile(), w.direction)
		for _, s := range steps(w.compile(), w.direction) {
			if s.after > s.before {
				continue
			}
			if i := slices.IndexFunc(undelayed, func(u change) bool { return u.at == s.at }); i < 0 || undelayed[i].after != s.after || undelayed[i].before < s.before {
				t.Fatalf("%vfall %+v is none of %+v", w, s, undelayed)
			}
		}
		w.route = withDelay(w.route, true)
		for _, s := range steps(w.compile(), w.direction) {
			from := s.at - w.train.Length
			if w.direction == codes.Reverse {
				from = s.at + w.train.Length
			}
			if s.after > s.before && !slices.ContainsFunc(undelayed, func(u change) bool { return u.at == from && u.before == s.before && u.after > u.before }) {
				t.Fatalf("%vrise %+v does not follow one of %+v", w, s, undelayed)
			}
		}
	})
}

// change is a place where the speed changes, as the train meets it.
type change struct {
	at            unit.Distance
	before, after unit.Speed
}

func steps(f step.Func, d codes.Direction) []change {
	var list []change
	for i := range f[1:] {
		c := change{f[i].To, f[i].Speed, f[i+1].Speed}
		if d == codes.Reverse {
			c.before, c.after = c.after, c.before
		}
		list = append(list, c)
	}
	return list
}

// With delays, a rise shorter than the train disappears; one of the same
// length, too, and a longer one is shorter by the train.
func TestShortRiseDisappears(t *testing.T) {
	check(t, 500, func(t *rapid.T) {
		n := func(low, high int) unit.Distance {
			return unit.Distance(rapid.IntRange(low, high).Draw(t, "")) * unit.Metre
		}
		a, b, length := n(1, 50), n(1, 50), n(1, 50)
		end := a + b + n(1, 50)
		direction := codes.Direction(rapid.IntRange(0, 1).Draw(t, ""))
		track, err := chainage.NewTrack(0, end, nil)
		if err != nil {
			t.Fatal(err)
		}
		route := &schema.Route{Track: track, Directions: codes.Both}
		add := func(from, to unit.Distance, v unit.Speed) {
			row := schema.SpeedRow{Basic: v}
			row.Start, row.End, row.Directions, row.Delay = from, to, codes.Both, true
			route.Speed = append(route.Speed, row)
		}
		add(0, a, 80)
		add(a, a+b, 120)
		add(a+b, end, 80)
		want := step.Func{{From: 0, To: end, Speed: 80}}
		if b > length {
			from, to := a+length, a+b
			if direction == codes.Reverse {
				from, to = a, a+b-length
			}
			want = step.Func{{From: 0, To: from, Speed: 80}, {From: from, To: to, Speed: 120}, {From: to, To: end, Speed: 80}}
		}
		got := profile.New(route, direction, profile.All).Compile(schema.Train{Length: length, Max: 200})
		if !slices.Equal(got, want) {
			t.Fatalf("rise %s m, train %s m: %v, want %v", b.M(), length.M(), got, want)
		}
	})
}

// Reversing the direction mirrors positions and moves the delay to the other
// side: a route that is laid the other way round has the mirrored profile.
func TestReversalMirrors(t *testing.T) {
	check(t, 500, func(t *rapid.T) {
		w := draw(t)
		m := w
		m.direction = 1 - w.direction
		m.route = mirrored(t, w.route)
		want := w.compile()
		for i, p := range want {
			want[i].From, want[i].To = w.route.Track.Length()-p.To, w.route.Track.Length()-p.From
		}
		slices.Reverse(want)
		if got := m.compile(); !slices.Equal(got, want) {
			t.Fatalf("%vmirrored %v, want %v", w, got, want)
		}
	})
}

// mirrored lays a route the other way round. Profiles go by running distance,
// so that the track needs no jumps.
func mirrored(t *rapid.T, r *schema.Route) *schema.Route {
	track, err := chainage.NewTrack(0, r.Track.Length(), nil)
	if err != nil {
		t.Fatal(err)
	}
	c := *r
	c.Track = track
	c.Speed, c.AxleLoad, c.Temporary = slices.Clone(r.Speed), slices.Clone(r.AxleLoad), slices.Clone(r.Temporary)
	turn := func(row *schema.Row) {
		row.Start, row.End = track.Length()-row.End, track.Length()-row.Start
		row.Directions = map[codes.Directions]codes.Directions{codes.OnlyNominal: codes.OnlyReverse, codes.OnlyReverse: codes.OnlyNominal, codes.Both: codes.Both}[row.Directions]
	}
	for i := range c.Speed {
		turn(&c.Speed[i].Row)
	}
	for i := range c.AxleLoad {
		turn(&c.AxleLoad[i].Row)
	}
	for i := range c.Temporary {
		turn(&c.Temporary[i].Row)
	}
	return &c
}
