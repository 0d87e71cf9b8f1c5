package fleet

import (
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
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

const halfMetre = unit.Metre / 2

// bound is a row as it binds a kind of train.
type bound struct {
	start, end unit.Distance
	delay      bool
	speed      unit.Speed
}

// holds gives the speed of a train whose front is at x: the lowest of the rows
// that any part of it between front and rear is still bound by (SUBSET-026
// 3.13.7; 3.11.3.1.3, 3.11.4.6, 3.11.5.3).
func holds(rows []bound, x, length unit.Distance, d codes.Direction) unit.Speed {
	v := unit.Speed(600)
	for _, r := range rows {
		start, end := r.start, r.end
		if r.delay && d == codes.Nominal {
			end += length
		}
		if r.delay && d == codes.Reverse {
			start -= length
		}
		if start < x && x < end {
			v = min(v, r.speed)
		}
	}
	return v
}

// boundsOf lists the rows that bind a class.
func boundsOf(r *schema.Route, c profile.Class, d codes.Direction, filter profile.Filter) []bound {
	var list []bound
	add := func(row schema.Row, v unit.Speed) {
		if v != 0 && row.Directions.Has(d) {
			list = append(list, bound{row.Start, row.End, row.Delay, v})
		}
	}
	for i := range r.Speed {
		add(r.Speed[i].Row, profile.StaticSpeedOf(&r.Speed[i], c))
	}
	for i := range r.AxleLoad {
		add(r.AxleLoad[i].Row, r.AxleLoad[i].Limit[c.AxleLoad])
	}
	for i := range r.Temporary {
		if filter == nil || filter(&r.Temporary[i]) {
			add(r.Temporary[i].Row, r.Temporary[i].Speed)
		}
	}
	return list
}

// trial is every kind of train and every length on a pair of routes.
type trial struct {
	drawn
	kinds   [][2][]bound
	lengths []unit.Distance
}

func (w drawn) trial(longest unit.Distance, filter profile.Filter) trial {
	s := trial{drawn: w, lengths: []unit.Distance{1}}
	for l := halfMetre; l <= longest; l += halfMetre {
		s.lengths = append(s.lengths, l)
	}
	seen := map[string]bool{}
	for _, c := range everyClass() {
		kind := [2][]bound{boundsOf(w.base, c, w.direction, filter), boundsOf(w.target, c, w.direction, filter)}
		if key := fmt.Sprint(kind); !seen[key] {
			seen[key] = true
			s.kinds = append(s.kinds, kind)
		}
	}
	return s
}

// sees tells whether a train of one of the lengths sees a difference with its
// front at b on the base's and at t on the target's track.
func (s trial) sees(b, t unit.Distance, lengths ...unit.Distance) bool {
	for _, kind := range s.kinds {
		for _, l := range lengths {
			if holds(kind[0], b, l, s.direction) != holds(kind[1], t, l, s.direction) {
				return true
			}
		}
	}
	return false
}

// checkReach tries every kind and length at the middle of each half metre; at
// whole and half metres speeds change, so that what holds in the middle holds
// in all of it. It tells whether a point is seen by lengths in between only.
func (s trial) checkReach(t fataler, reach []align.Interval) (between bool) {
	old := metre.Cells(s.base.Track, unit.Metre)
	for i, cell := range metre.Cells(s.target.Track, unit.Metre) {
		k := slices.Index(old, cell)
		for _, part := range [...]unit.Distance{halfMetre / 2, halfMetre + halfMetre/2} {
			x := unit.Distance(i)*unit.Metre + part
			want := false
			if b := unit.Distance(k)*unit.Metre + part; k >= 0 {
				want = s.sees(b, x, s.lengths...)
				between = between || want && !s.sees(b, x, s.lengths[0], s.lengths[len(s.lengths)-1])
			}
			if got := slices.ContainsFunc(reach, func(r align.Interval) bool { return r.From <= x && x < r.To }); got != want {
				t.Fatalf("%vlongest %s m: at %s m seen %t, want %t; reach %v", s.drawn, s.lengths[len(s.lengths)-1].M(), x.M(), got, want, reach)
			}
		}
	}
	for i, r := range reach {
		if r.From >= r.To || i > 0 && reach[i-1].To >= r.From || r.From%halfMetre != 0 || r.To%halfMetre != 0 {
			t.Fatalf("%vreach is not in order, joined and exact: %v", s.drawn, reach)
		}
	}
	return between
}

type fataler interface{ Fatalf(string, ...any) }

// ladder draws a short route of rows that hold on one another: few speeds,
// most with train length delay, many rises. The target differs in one to three
// things; one side may have a joint that the other has not.
func ladder(t *rapid.T) drawn {
	d := diceOf(t)
	w := drawn{dice: d, grid: unit.Metre}
	n := d(8, 32)
	var rows []rung
	for from := 0; from < n; {
		to := min(n, from+d(1, 7))
		rows = append(rows, rung{from: from, to: to, speed: 20 * d(2, 7), delay: d(0, 2) > 0, directions: 3})
		if d(0, 3) == 0 { // passenger trains have another speed
			rows[len(rows)-1].other, rows[len(rows)-1].replaces = 20*d(1, 8), d(0, 1) == 1
		}
		from = to
	}
	for range d(0, 4) {
		rows = append(rows, over(d, n))
	}
	edited := slices.Clone(rows)
	for range d(1, 3) {
		i := d(0, len(edited)-1)
		switch e := &edited[i]; d(0, 5) {
		case 0:
			e.speed = 20 * d(2, 7)
		case 1:
			e.delay = !e.delay
		case 2:
			e.other, e.replaces = 20*d(1, 8), d(0, 1) == 1
		case 3:
			edited = append(edited, over(d, n))
		case 4: // two neighbours share their joint
			if e.layer == 0 && e.to < n && e.to-e.from > 1 {
				by := d(1, e.to-e.from-1)
				for k := range edited {
					if x := &edited[k]; x.layer == 0 && x.from == e.to {
						x.from -= by
					}
				}
				e.to -= by
			}
		case 5:
			if e.layer != 0 {
				edited = slices.Delete(edited, i, i+1)
			}
		}
	}
	joints := [2][2]int{}
	if k := d(0, 4); k < 3 { // on the base, on the target, on both and different
		for side := range joints {
			if k == 2 || k == side {
				joints[side] = [2]int{d(2, n-5), d(1, 3) * (1 - 2*d(0, 1))}
			}
		}
	}
	w.base, w.target = layRungs(n, rows, joints[0]), layRungs(n, edited, joints[1])
	if w.base == nil || w.target == nil {
		t.Skip("no such track")
	}
	return w.directed(t)
}

// rung is a row of a ladder, from metre to metre as the posts would read
// without a joint.
type rung struct {
	from, to, speed, other int
	delay, replaces        bool
	layer                  int // 0 static, 1 axle load, 2 temporary
	directions             codes.Directions
}

// over draws a row of one of the other tables.
func over(d metre.Dice, n int) rung {
	from := d(0, n-1)
	return rung{from: from, to: d(from+1, min(n, from+8)), speed: 20 * d(1, 6), delay: d(0, 3) > 0, layer: d(1, 2), directions: codes.Directions(d(1, 3))}
}

// layRungs makes a route of rows. At a joint, metres are taken out of the track
// (posts are missing) or put in (posts repeat).
func layRungs(n int, rows []rung, joint [2]int) *schema.Route {
	at, by := joint[0], joint[1]
	var jumps []chainage.Jump
	if by != 0 {
		jumps = []chainage.Jump{{Arriving: unit.Distance(at) * unit.Metre, Leaving: unit.Distance(at+by) * unit.Metre}}
	}
	track, err := chainage.NewTrack(0, unit.Distance(n)*unit.Metre, jumps)
	if err != nil {
		return nil
	}
	laid := func(km int) unit.Distance {
		if km > at {
			km = max(at, km-by)
		}
		return unit.Distance(km) * unit.Metre
	}
	r := &schema.Route{ID: "r", Track: track, Directions: codes.Both}
	for _, x := range rows {
		row := schema.Row{Start: laid(x.from), End: laid(x.to), Delay: x.delay}
		row.Directions = x.directions
		if row.Start == row.End {
			continue
		}
		switch x.layer {
		case 0:
			s := schema.SpeedRow{Row: row, Basic: unit.Speed(x.speed)}
			s.Other[codes.Passenger], s.Replaces[codes.Passenger] = unit.Speed(x.other), x.replaces
			r.Speed = append(r.Speed, s)
		case 1:
			a := schema.AxleLoadRow{Row: row}
			a.Limit[9] = unit.Speed(x.speed)
			r.AxleLoad = append(r.AxleLoad, a)
		case 2:
			r.Temporary = append(r.Temporary, schema.TemporaryRow{Row: row, ID: "T", Speed: unit.Speed(x.speed)})
		}
	}
	return r
}

// A point is in the reach exactly if some train of some length up to the
// longest sees a difference there, tried one by one.
func TestReachIsThatOfEveryLength(t *testing.T) {
	for _, test := range []struct {
		name   string
		checks int
		draw   func(*rapid.T) drawn
		most   int // half metres of the longest train
		least  int // draws in which only lengths in between see a point
	}{
		{"ladders", 150, ladder, 24, 10},
		{"sketches", 25, func(t *rapid.T) drawn { return draw(t, unit.Metre) }, 16, 0},
	} {
		t.Run(test.name, func(t *testing.T) {
			between, some := 0, 0
			check(t, test.checks, func(t *rapid.T) {
				w := test.draw(t)
				longest := unit.Distance(w.dice(2, test.most)) * halfMetre
				filter := [...]profile.Filter{profile.All, profile.NoTemporary}[w.dice(0, 1)]
				asked := [][]unit.Distance{{longest}, {unit.Metre, longest}, {longest, halfMetre}}[w.dice(0, 2)]
				reach := w.compare(filter, asked...).Reach
				if w.trial(slices.Max(asked), filter).checkReach(t, reach) {
					between++
				}
				if len(reach) > 0 {
					some++
				}
			})
			if !t.Failed() && !testing.Short() && flag.Lookup("rapid.checks").Value.String() == "100" && (between < test.least || some < test.checks/3) {
				t.Errorf("%d draws with a reach, %d where it is that of lengths in between", some, between)
			}
			t.Logf("%d draws with a reach, %d where it is that of lengths in between", some, between)
		})
	}
}

// Law: where a train of a length between those asked for, of whole metres, sees a
// change, a change is listed for its kind on the same stretch of the reach.
func TestNothingIsSeenOnlyBetween(t *testing.T) {
	between := 0
	check(t, 100, func(t *rapid.T) {
		w := ladder(t)
		short := unit.Distance(w.dice(1, 3)) * halfMetre
		long := short + unit.Distance(w.dice(2, 20))*halfMetre
		r := w.compare(profile.All, short, long)
		between += len(r.Between)
		all := append(slices.Clone(r.Changes), r.Between...)
		sides := [2]*profile.Compiler{profile.New(w.base, w.direction, profile.All), profile.New(w.target, w.direction, profile.All)}
		type sight struct {
			at     delta.Delta
			length unit.Distance
		}
		seen := bySelection(sides, func(before, after profile.Selection) (list []sight) {
			for length := (short/unit.Metre + 1) * unit.Metre; length <= long; length += unit.Metre {
				for _, d := range delta.Between(sides[0].Sweep(before, length, profile.NoMaximum), sides[1].Sweep(after, length, profile.NoMaximum), w.cells()) {
					list = append(list, sight{d, length})
				}
			}
			return list
		})
		for _, c := range everyClass() {
			for _, x := range seen(c) {
				k := slices.IndexFunc(r.Reach, func(i align.Interval) bool { return i.From <= x.at.Target && x.at.Target < i.To })
				if k < 0 {
					t.Fatalf("%v%+v lies outside the reach %v", w, x, r.Reach)
				}
				if !slices.ContainsFunc(all, func(l Change) bool {
					return l.Target < r.Reach[k].To && r.Reach[k].From < l.Target+l.Length && slices.ContainsFunc(l.Products, func(p Product) bool { return p.Has(c) })
				}) {
					t.Fatalf("%vclass %+v sees %+v, and on %v nothing is listed for it: %+v", w, c, x, r.Reach[k], all)
				}
			}
		}
		for _, x := range r.Between {
			if x.TrainLength <= short || x.TrainLength > long {
				t.Fatalf("%v%+v is not between %d and %d", w, x, short, long)
			}
		}
	})
	if !t.Failed() && !testing.Short() && flag.Lookup("rapid.checks").Value.String() == "100" && between == 0 {
		t.Error("no draw has a change that only lengths between see")
	}
	t.Logf("%d changes that only lengths between see", between)
}

// Reaches that were worked out by hand: at x, a train sees the rows at its
// front and the delayed ones that end less than its length behind.
func TestReach(t *testing.T) {
	row := func(from, to, speed int, delay bool) rung {
		return rung{from: from, to: to, speed: speed, delay: delay, directions: 3}
	}
	temporary := func(from, to, speed int, delay bool) rung {
		r := row(from, to, speed, delay)
		r.layer = 2
		return r
	}
	type list = []rung
	// An element of 5 m is raised between a slow one before it and a fast one
	// after it, both sides delayed alike.
	step := func(v int) list { return list{row(0, 5, 60, true), row(5, 10, v, true), row(10, 40, 120, false)} }
	mirror := func(rows list) list {
		out := slices.Clone(rows)
		for i, r := range rows {
			out[i].from, out[i].to = 40-r.to, 40-r.from
		}
		return out
	}
	tests := []struct {
		name           string
		base, target   list
		baseJ, targetJ [2]int
		direction      codes.Direction
		longest        int // half metres
		want           [][2]int
	}{
		{"nothing differs", step(80), step(80), [2]int{}, [2]int{}, codes.Nominal, 24, nil},
		{"3.11.3.1.3 the raise runs out one train length", step(80), step(100), [2]int{}, [2]int{}, codes.Nominal, 24, [][2]int{{5, 22}}},
		{"3.11.3.1.3 the same in reverse", mirror(step(80)), mirror(step(100)), [2]int{}, [2]int{}, codes.Reverse, 24, [][2]int{{18, 35}}},
		{"without delay only where it is written", list{row(0, 5, 60, false), row(5, 10, 80, false), row(10, 40, 120, false)}, list{row(0, 5, 60, false), row(5, 10, 90, false), row(10, 40, 120, false)}, [2]int{}, [2]int{}, codes.Nominal, 24, [][2]int{{5, 10}}},
		{"a row cut in two that says the same", list{row(0, 20, 60, true), row(20, 40, 100, true)}, list{row(0, 8, 60, true), row(8, 20, 60, true), row(20, 40, 100, true)}, [2]int{}, [2]int{}, codes.Nominal, 24, nil},
		{"the delay alone is taken away", list{row(0, 20, 60, true), row(20, 40, 100, true)}, list{row(0, 20, 60, false), row(20, 40, 100, true)}, [2]int{}, [2]int{}, codes.Nominal, 14, [][2]int{{20, 27}}},
		{"the delay alone in reverse", list{row(0, 20, 100, true), row(20, 40, 60, true)}, list{row(0, 20, 100, true), row(20, 40, 60, false)}, [2]int{}, [2]int{}, codes.Reverse, 14, [][2]int{{13, 20}}},
		{"the delay of the faster row alone", list{row(0, 20, 60, true), row(20, 40, 100, true)}, list{row(0, 20, 60, true), row(20, 40, 100, false)}, [2]int{}, [2]int{}, codes.Reverse, 14, nil},
		{"cut at the end of the route", list{row(0, 36, 60, true), row(36, 40, 100, true)}, list{row(0, 36, 60, false), row(36, 40, 100, true)}, [2]int{}, [2]int{}, codes.Nominal, 24, [][2]int{{36, 40}}},
		{"3.11.5.4 a lower temporary restriction hides all", append(step(80), temporary(0, 40, 40, true)), append(step(100), temporary(0, 40, 40, true)), [2]int{}, [2]int{}, codes.Nominal, 24, nil},
		{"a lower one hides it up to its end, the longer trains after", append(step(80), temporary(4, 12, 40, true)), append(step(100), temporary(4, 12, 40, true)), [2]int{}, [2]int{}, codes.Nominal, 24, nil},
		{"a lower one without delay hides it up to its end", append(step(80), temporary(4, 12, 40, false)), append(step(100), temporary(4, 12, 40, false)), [2]int{}, [2]int{}, codes.Nominal, 24, [][2]int{{12, 22}}},
		{"a lower one ahead", append(step(80), temporary(15, 18, 40, false)), append(step(100), temporary(15, 18, 40, false)), [2]int{}, [2]int{}, codes.Nominal, 24, [][2]int{{5, 15}, {18, 22}}},
		// The target has no metres 20 to 22: the row that ends at 18 reaches
		// beyond by 2 m more of posts. Posts 22 and after lie 2 m earlier.
		{"a joint that the target only has", list{row(0, 18, 60, true), row(18, 40, 100, false)}, list{row(0, 18, 60, true), row(18, 40, 100, false)}, [2]int{}, [2]int{20, 2}, codes.Nominal, 10, [][2]int{{20, 23}}},
		{"a joint that both have", list{row(0, 18, 60, true), row(18, 40, 100, false)}, list{row(0, 18, 60, true), row(18, 40, 100, false)}, [2]int{20, 2}, [2]int{20, 2}, codes.Nominal, 10, nil},
		// The base has posts 17 to 20 twice: 3 m more of track before 20.
		{"a joint that the base only has", list{row(0, 18, 60, true), row(18, 40, 100, false)}, list{row(0, 18, 60, true), row(18, 40, 100, false)}, [2]int{20, -3}, [2]int{}, codes.Nominal, 10, [][2]int{{20, 23}}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			w := drawn{base: layRungs(40, test.base, test.baseJ), target: layRungs(40, test.target, test.targetJ), direction: test.direction}
			longest := unit.Distance(test.longest) * halfMetre
			var want []align.Interval
			for _, x := range test.want {
				want = append(want, align.Interval{From: unit.Distance(x[0]) * unit.Metre, To: unit.Distance(x[1]) * unit.Metre})
			}
			got := w.compare(profile.All, longest).Reach
			if !slices.Equal(got, want) {
				t.Errorf("%v, want %v", got, want)
			}
			w.trial(longest, profile.All).checkReach(t, got)
		})
	}
}
