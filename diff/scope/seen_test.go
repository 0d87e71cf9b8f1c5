package scope

import (
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/align"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// How much a declaration sees of a change, and what of that it sees by others in the
// same place as well: what is visible today and goes further without temporary
// restrictions counts once (rules.md, Declared against observed).
func TestSeen(t *testing.T) {
	raise := Observed{From: 100 * m, To: 200 * m, Train: 1, TrainLength: 30 * m, Raised: true}
	runOut := Observed{From: 200 * m, To: 230 * m, Train: 1, TrainLength: 30 * m, Raised: true, RunOut: true, RowEnds: []unit.Distance{200 * m}}
	all := Declared{Directions: codes.Both, From: 0, To: 300 * m}
	upTo := func(to unit.Distance) Declared { return Declared{Directions: codes.Both, From: 0, To: to * m} }
	with := func(d Declared, change func(*Declared)) Declared { change(&d); return d }
	from := func(o Observed, from, to unit.Distance) Observed { o.From, o.To = from*m, to*m; return o }
	undeclared := func(o Observed, from, to unit.Distance) Observed {
		o.undeclared = []align.Interval{{From: from * m, To: to * m}}
		return o
	}
	lowered := func(o Observed) Observed { o.Raised = false; return o }
	tests := []struct {
		name         string
		observed     Observed
		others       []Observed
		declared     Declared
		seen, both   unit.Distance
		run, runBoth unit.Distance
	}{
		{"no others", raise, nil, all, 100, 0, 0, 0},
		{"of another sense", raise, []Observed{raise}, with(all, func(d *Declared) { d.Effect = schema.Lower }), 0, 0, 0, 0},
		{"of another train", raise, []Observed{raise}, with(all, func(d *Declared) { d.Trains = []int{2} }), 0, 0, 0, 0},
		{"elsewhere", raise, []Observed{raise}, with(all, func(d *Declared) { d.From = 250 * m }), 0, 0, 0, 0},
		{"elsewhere, which only touches", raise, []Observed{raise}, with(all, func(d *Declared) { d.From = 200 * m }), 0, 0, 0, 0},
		{"a part of it", raise, []Observed{raise}, upTo(150), 50, 50, 0, 0},
		{"the second of two, which touch", raise, []Observed{from(raise, 0, 100), raise}, all, 100, 100, 0, 0},
		{"one that only touches behind it", raise, []Observed{from(raise, 200, 300)}, all, 100, 0, 0, 0},
		{"one that only touches before it", raise, []Observed{from(raise, 0, 100)}, all, 100, 0, 0, 0},
		{"one that is wider", raise, []Observed{from(raise, 0, 300)}, all, 100, 100, 0, 0},
		{"two in it, with a gap, and one behind", raise, []Observed{from(raise, 0, 120), from(raise, 150, 160), from(raise, 250, 300)}, all, 100, 30, 0, 0},
		{"one behind that ends first of all", from(raise, 100, 400), []Observed{from(raise, 300, 350)}, all, 200, 0, 0, 0},
		{"a lowered one where the declaration is for a raise", raise, []Observed{lowered(raise)}, with(all, func(d *Declared) { d.Effect = schema.Raise }), 100, 0, 0, 0},
		{"a raise where the declaration is to lower", lowered(raise), []Observed{raise}, with(all, func(d *Declared) { d.Effect = schema.Lower }), 100, 0, 0, 0},
		{"a lowered one where any sense is declared", raise, []Observed{lowered(raise)}, all, 100, 100, 0, 0},
		{"both run-out", runOut, []Observed{runOut}, upTo(200), 0, 0, 30, 30},
		{"both run-out, of a shorter train", runOut, []Observed{from(runOut, 200, 210)}, upTo(200), 0, 0, 30, 10},
		{"run-out of a row that ends elsewhere", runOut, []Observed{with2(runOut, func(o *Observed) { o.RowEnds = []unit.Distance{210 * m} })}, upTo(200), 0, 0, 30, 0},
		{"run-out beside a change that is none", runOut, []Observed{with2(runOut, func(o *Observed) { o.RunOut = false })}, upTo(200), 0, 0, 30, 0},
		{"run-out within the declaration and past it", runOut, []Observed{runOut}, upTo(210), 10, 10, 20, 20},
		{"run-out that is outside at the beginning of one and at the end of the other", undeclared(runOut, 200, 210), []Observed{undeclared(runOut, 220, 230)}, upTo(200), 0, 0, 20, 10},
		{"run-out that is outside on other parts", undeclared(runOut, 200, 215), []Observed{undeclared(runOut, 215, 230)}, upTo(200), 0, 0, 15, 0},
		{"run-out of a train that goes further", from(runOut, 200, 250), []Observed{runOut}, upTo(200), 0, 0, 30, 30},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			if inside, run := Seen(&test.observed, &test.declared); inside != test.seen*m || run != test.run*m {
				t.Errorf("sees %s+%s m, want %d+%d", inside.M(), run.M(), test.seen, test.run)
			}
			if inside, run := SeenBoth(&test.observed, test.others, &test.declared); inside != test.both*m || run != test.runBoth*m {
				t.Errorf("sees %s+%s m by the others too, want %d+%d", inside.M(), run.M(), test.both, test.runBoth)
			}
		})
	}
}

// Metre by metre: what is seen is what lies in the declaration, and past its far end
// as far as the train carries a row that ends in it; by both, what is by the one and
// by another.
func TestSeenPointByPoint(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		number := func(name string) unit.Distance { return unit.Distance(rapid.IntRange(0, 40).Draw(t, name)) }
		direction := codes.Direction(rapid.IntRange(0, 1).Draw(t, "direction"))
		trainLength := 1 + number("train length")
		draw := func(from unit.Distance) Observed {
			return Observed{
				Direction: direction, From: from, To: from + 1 + number("length"), Train: 1, TrainLength: trainLength,
				Raised: rapid.Bool().Draw(t, "raised"), RunOut: rapid.Bool().Draw(t, "run-out"), RowEnds: []unit.Distance{number("end")},
			}
		}
		o := draw(number("from"))
		var others []Observed
		at := number("first")
		for range rapid.IntRange(0, 4).Draw(t, "others") {
			x := draw(at)
			others, at = append(others, x), x.To+unit.Distance(rapid.IntRange(0, 5).Draw(t, "gap"))
		}
		start := number("d from")
		d := Declared{Directions: codes.Directions(rapid.IntRange(1, 3).Draw(t, "d directions")), From: start, To: start + 1 + number("d length"), Effect: schema.Effect(rapid.IntRange(0, 2).Draw(t, "effect"))}
		// by says how a declaration sees a change at a place: 1 inside, 2 by run-out.
		by := func(x *Observed, s unit.Distance) int {
			switch {
			case s < x.From || s >= x.To || !d.Directions.Has(direction) || d.Effect == schema.Raise && !x.Raised || d.Effect == schema.Lower && x.Raised:
				return 0
			case d.From <= s && s < d.To:
				return 1
			case !x.RunOut:
				return 0
			}
			end := x.RowEnds[0]
			if direction == codes.Nominal && d.From <= end-1 && end-1 < d.To && s >= d.To && end <= s && s < end+trainLength ||
				direction == codes.Reverse && d.From <= end && end < d.To && s < d.From && s < end && s >= end-trainLength {
				return 2
			}
			return 0
		}
		var want, wantBoth [3]unit.Distance
		for s := o.From; s < o.To; s++ {
			k := by(&o, s)
			want[k]++
			if slices.ContainsFunc(others, func(x Observed) bool { return by(&x, s) == k }) {
				wantBoth[k]++
			}
		}
		if inside, run := Seen(&o, &d); inside != want[1] || run != want[2] {
			t.Fatalf("sees %d+%d, want %d+%d: %+v by %+v", inside, run, want[1], want[2], o, d)
		}
		if inside, run := SeenBoth(&o, others, &d); inside != wantBoth[1] || run != wantBoth[2] {
			t.Fatalf("sees %d+%d by others too, want %d+%d: %+v and %+v by %+v", inside, run, wantBoth[1], wantBoth[2], o, others, d)
		}
	})
}
