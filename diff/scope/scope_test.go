package scope

import (
	"reflect"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/align"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

const m = unit.Metre

func TestCut(t *testing.T) {
	raise := Observed{From: 100 * m, To: 200 * m, Train: 1, TrainLength: 30 * m, Raised: true}
	runOut := Observed{From: 200 * m, To: 230 * m, Train: 1, TrainLength: 30 * m, RunOut: true, RowEnds: []unit.Distance{200 * m}}
	back := runOut
	back.Direction, back.From, back.To, back.RowEnds = codes.Reverse, 70*m, 100*m, []unit.Distance{100 * m}
	all := Declared{Directions: codes.Both, From: 100 * m, To: 200 * m}
	with := func(change func(*Declared)) Declared { d := all; change(&d); return d }
	tests := []struct {
		name     string
		observed Observed
		declared []Declared
		want     []Piece
	}{
		{"nothing declared", raise, nil, []Piece{{100 * m, 200 * m, Outside, false}}},
		{"covered", raise, []Declared{all}, []Piece{{100 * m, 200 * m, 0, false}}},
		{"sense", raise, []Declared{with(func(d *Declared) { d.Effect = schema.Lower })}, []Piece{{100 * m, 200 * m, Outside, false}}},
		{"direction", raise, []Declared{with(func(d *Declared) { d.Directions = codes.OnlyReverse })}, []Piece{{100 * m, 200 * m, Outside, false}}},
		{"other train", raise, []Declared{with(func(d *Declared) { d.Trains = []int{0} })}, []Piece{{100 * m, 200 * m, Outside, false}}},
		{"no train", raise, []Declared{with(func(d *Declared) { d.Trains = []int{} })}, []Piece{{100 * m, 200 * m, Outside, false}}},
		{"a part", raise, []Declared{with(func(d *Declared) { d.From, d.To = 120*m, 150*m })},
			[]Piece{{100 * m, 120 * m, Outside, false}, {120 * m, 150 * m, 0, false}, {150 * m, 200 * m, Outside, false}}},
		{"two that meet", raise, []Declared{with(func(d *Declared) { d.To = 150 * m }), with(func(d *Declared) { d.From = 150 * m })},
			[]Piece{{100 * m, 150 * m, 0, false}, {150 * m, 200 * m, 1, false}}},
		{"overlapping: the first counts", raise, []Declared{with(func(d *Declared) { d.To = 150 * m }), all},
			[]Piece{{100 * m, 150 * m, 0, false}, {150 * m, 200 * m, 1, false}}},
		{"run-out past the far end", runOut, []Declared{all}, []Piece{{200 * m, 230 * m, 0, true}}},
		{"run-out against the distance", back, []Declared{all}, []Piece{{70 * m, 100 * m, 0, true}}},
		{"run-out of a row that ends elsewhere", runOut, []Declared{with(func(d *Declared) { d.To = 190 * m })}, []Piece{{200 * m, 230 * m, Outside, false}}},
		{"run-out of a row that ends where it begins", runOut, []Declared{with(func(d *Declared) { d.From, d.To = 200*m, 205*m })},
			[]Piece{{200 * m, 205 * m, 0, false}, {205 * m, 230 * m, Outside, false}}},
		{"the same against the distance", back, []Declared{with(func(d *Declared) { d.From, d.To = 95*m, 100*m })},
			[]Piece{{70 * m, 95 * m, Outside, false}, {95 * m, 100 * m, 0, false}}},
		{"run-out longer than the train", with2(runOut, func(o *Observed) { o.To = 240 * m }), []Declared{all},
			[]Piece{{200 * m, 230 * m, 0, true}, {230 * m, 240 * m, Outside, false}}},
		// Two rows hold the train: a reduction is inside as far as one of them does
		// that ends inside, a raise needs both to end inside where both hold.
		{"a reduction by two rows", with2(runOut, func(o *Observed) { o.To, o.RowEnds = 250*m, []unit.Distance{200 * m, 220 * m} }), []Declared{all},
			[]Piece{{200 * m, 230 * m, 0, true}, {230 * m, 250 * m, Outside, false}}},
		{"in the other order", with2(runOut, func(o *Observed) { o.To, o.RowEnds = 250*m, []unit.Distance{220 * m, 200 * m} }), []Declared{all},
			[]Piece{{200 * m, 230 * m, 0, true}, {230 * m, 250 * m, Outside, false}}},
		{"a raise by two rows", with2(runOut, func(o *Observed) { o.To, o.RowEnds, o.Raised = 250*m, []unit.Distance{200 * m, 220 * m}, true }), []Declared{all},
			[]Piece{{200 * m, 220 * m, 0, true}, {220 * m, 250 * m, Outside, false}}},
		{"a raise by two rows, of two declarations", with2(runOut, func(o *Observed) { o.To, o.RowEnds, o.Raised = 250*m, []unit.Distance{200 * m, 220 * m}, true }),
			[]Declared{all, with(func(d *Declared) { d.From, d.To = 210*m, 220*m })},
			[]Piece{{200 * m, 210 * m, 0, true}, {210 * m, 220 * m, 1, false}, {220 * m, 230 * m, 0, true}, {230 * m, 250 * m, 1, true}}},
		{"a raise by two rows against the distance", with2(back, func(o *Observed) { o.From, o.RowEnds, o.Raised = 50*m, []unit.Distance{80 * m, 100 * m}, true }), []Declared{all},
			[]Piece{{50 * m, 80 * m, Outside, false}, {80 * m, 100 * m, 0, true}}},
		{"a raise by a row that is the same, and another", with2(runOut, func(o *Observed) { o.Raised, o.Same = true, []unit.Distance{185 * m} }), []Declared{all},
			[]Piece{{200 * m, 215 * m, Outside, false}, {215 * m, 230 * m, 0, true}}},
		// The rows of a raise are the base's: they reach as far as they do there, and
		// end inside by the stretch that the declaration has there.
		{"a raise further on than on the base", with2(runOut, func(o *Observed) {
			o.Raised, o.Ahead, o.RowEnds = true, 50*m, []unit.Distance{150 * m, 140 * m}
		}), []Declared{with(func(d *Declared) { d.Base = &align.Interval{From: 140 * m, To: 150 * m} })},
			[]Piece{{200 * m, 220 * m, Outside, false}, {220 * m, 230 * m, 0, true}}},
		{"a raise, declared up to where only the base has track", with2(back, func(o *Observed) { o.Raised, o.RowEnds = true, []unit.Distance{100 * m} }),
			[]Declared{with(func(d *Declared) { d.From, d.To, d.Base = 80*m, 100*m, &align.Interval{From: 80 * m, To: 150 * m} })},
			[]Piece{{70 * m, 80 * m, 0, true}, {80 * m, 100 * m, 0, false}}},
		{"a reduction, declared likewise", with2(back, func(o *Observed) { o.RowEnds = []unit.Distance{100 * m} }),
			[]Declared{with(func(d *Declared) { d.From, d.To, d.Base = 80*m, 100*m, &align.Interval{From: 80 * m, To: 150 * m} })},
			[]Piece{{70 * m, 80 * m, Outside, false}, {80 * m, 100 * m, 0, false}}},
		{"a raise by two rows far from each other", with2(runOut, func(o *Observed) { o.To, o.RowEnds, o.Raised = 300*m, []unit.Distance{200 * m, 260 * m}, true }), []Declared{all},
			[]Piece{{200 * m, 230 * m, 0, true}, {230 * m, 300 * m, Outside, false}}},
		// Past the far end begins where the declaration ends on the track of the rows.
		{"a raise within what is declared on the base alone", with2(runOut, func(o *Observed) {
			o.From, o.To, o.Raised, o.Ahead, o.RowEnds = 195*m, 225*m, true, 50*m, []unit.Distance{145 * m}
		}), []Declared{with(func(d *Declared) { d.To, d.Base = 190*m, &align.Interval{From: 140 * m, To: 150 * m} })},
			[]Piece{{195 * m, 200 * m, Outside, false}, {200 * m, 225 * m, 0, true}}},
		{"the same against the distance, on the base", with2(back, func(o *Observed) {
			o.From, o.To, o.Raised, o.Ahead, o.RowEnds = 125*m, 155*m, true, 50*m, []unit.Distance{105 * m}
		}), []Declared{with(func(d *Declared) { d.From, d.Base = 160*m, &align.Interval{From: 100 * m, To: 110 * m} })},
			[]Piece{{125 * m, 150 * m, 0, true}, {150 * m, 155 * m, Outside, false}}},
		{"as far as the row reaches, not the declaration", with2(runOut, func(o *Observed) { o.From, o.To = 205*m, 235*m }), []Declared{with(func(d *Declared) { d.To = 205 * m })},
			[]Piece{{205 * m, 230 * m, 0, true}, {230 * m, 235 * m, Outside, false}}},
		{"not run-out", with2(runOut, func(o *Observed) { o.RunOut = false }), []Declared{all}, []Piece{{200 * m, 230 * m, Outside, false}}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			if got := Cut(&test.observed, test.declared); !reflect.DeepEqual(got, test.want) {
				t.Errorf("got %v, want %v", got, test.want)
			}
		})
	}
}

func with2(o Observed, change func(*Observed)) Observed { change(&o); return o }

// Point by point: a piece is inside exactly where some declaration says so.
func TestCutPointByPoint(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		number := func(name string) unit.Distance { return unit.Distance(rapid.IntRange(0, 60).Draw(t, name)) }
		from := number("from")
		o := Observed{
			Direction: codes.Direction(rapid.IntRange(0, 1).Draw(t, "direction")), From: from, To: from + 1 + number("length"),
			Train: rapid.IntRange(0, 2).Draw(t, "train"), TrainLength: 1 + number("train length"),
			Raised: rapid.Bool().Draw(t, "raised"), RunOut: rapid.Bool().Draw(t, "run-out"),
			RowEnds: rapid.SliceOfN(rapid.Custom(func(t *rapid.T) unit.Distance { return unit.Distance(rapid.IntRange(0, 60).Draw(t, "at")) }), 0, 3).Draw(t, "ends"),
		}
		var declared []Declared
		for range rapid.IntRange(0, 4).Draw(t, "declarations") {
			from := number("d from")
			d := Declared{
				Directions: codes.Directions(rapid.IntRange(1, 3).Draw(t, "d directions")), From: from, To: from + 1 + number("d length"),
				Effect: schema.Effect(rapid.IntRange(0, 2).Draw(t, "effect")),
			}
			if rapid.Bool().Draw(t, "named") {
				d.Trains = rapid.SliceOfN(rapid.IntRange(0, 2), 0, 2).Draw(t, "trains")
			}
			declared = append(declared, d)
		}
		pieces := Cut(&o, declared)
		at := o.From
		for _, p := range pieces {
			if p.From != at || p.To <= p.From {
				t.Fatalf("pieces do not touch: %v", pieces)
			}
			at = p.To
		}
		if at != o.To {
			t.Fatalf("pieces end at %d: %v", at, pieces)
		}
		right := func(d *Declared) bool {
			return d.Directions.Has(o.Direction) && (d.Trains == nil || slices.Contains(d.Trains, o.Train)) &&
				(d.Effect == schema.AnyEffect || (d.Effect == schema.Raise) == o.Raised)
		}
		// The last millimetre of the row, seen in the direction of travel, lies in the
		// declaration.
		endsIn := func(d *Declared, end unit.Distance) bool {
			if o.Direction == codes.Nominal {
				end--
			}
			return d.From <= end && end < d.To
		}
		for s := o.From; s < o.To; s++ {
			var holding []unit.Distance // ends of the rows that hold the train at s
			for _, end := range o.RowEnds {
				if behind := map[codes.Direction]unit.Distance{codes.Nominal: s - end, codes.Reverse: end - 1 - s}[o.Direction]; 0 <= behind && behind < o.TrainLength {
					holding = append(holding, end)
				}
			}
			declaredEnd := func(end unit.Distance) bool {
				return slices.ContainsFunc(declared, func(d Declared) bool { return right(&d) && endsIn(&d, end) })
			}
			inside := slices.ContainsFunc(declared, func(d Declared) bool { return right(&d) && d.From <= s && s < d.To })
			if !inside && o.RunOut && len(holding) > 0 {
				undeclared := slices.ContainsFunc(holding, func(end unit.Distance) bool { return !declaredEnd(end) })
				inside = slices.ContainsFunc(holding, declaredEnd) && !(o.Raised && undeclared)
			}
			i := slices.IndexFunc(pieces, func(p Piece) bool { return p.From <= s && s < p.To })
			if (pieces[i].By != Outside) != inside {
				t.Fatalf("at %d: inside is %v, pieces %v", s, inside, pieces)
			}
		}
	})
}
