// Package scope holds what change requests declare against what is observed.
//
// Changes are cut at the limits of the declarations. A piece is inside where a
// declaration covers its direction, range, sense and train; the run-out of a
// train length may lie past the far end of the declaration that holds the row
// behind it. Everything else is outside.
//
//	pieces := scope.Cut(&observed, declared)
//	inside, runOut := scope.Seen(&observed, &declared[0])
package scope

import (
	"slices"
	"sort"

	"speedtrail/diff/align"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Observed is a change on one route that one train sees. Distances are running
// distances on the target's track.
type Observed struct {
	Direction   codes.Direction
	From, To    unit.Distance
	Train       int
	TrainLength unit.Distance
	Raised      bool
	RunOut      bool
	// Ahead: by how much a raise by run-out lies further on on the target's track than
	// on the base's. The rows that held the train back are rows of the base.
	Ahead unit.Distance
	// RowEnds are the far ends, in the direction of travel, of the altered rows that
	// govern the change, or held it back: for a raise on the base's track.
	RowEnds []unit.Distance
	// Same are those of rows that held a raise back and are not altered: the track
	// differs, and no row that is declared lets the train go.
	Same []unit.Distance

	// undeclared is where a row holds the raise back that no declaration lets go.
	undeclared []align.Interval
}

// Declared is what a change request declares on one route.
type Declared struct {
	Directions codes.Directions
	From, To   unit.Distance
	Effect     schema.Effect
	Trains     []int // nil: every train
	// Base is the stretch on the base's track, where a raise by run-out has its rows;
	// nil: the same running distances.
	Base *align.Interval
}

// Outside stands in Piece.By for no declaration.
const Outside = -1

// Piece is a part of an observed change that one declaration holds, or none.
type Piece struct {
	From, To unit.Distance
	By       int // index of the declaration, the first that holds it; or Outside
	// RunOut: it is inside only as the run-out of a train length past the far
	// end of the declaration.
	RunOut bool
}

// allows tells whether the declaration is for this direction, sense and train.
func (d *Declared) allows(o *Observed) bool {
	switch {
	case !d.Directions.Has(o.Direction),
		d.Effect == schema.Raise && !o.Raised,
		d.Effect == schema.Lower && o.Raised,
		d.Trains != nil && !slices.Contains(d.Trains, o.Train):
		return false
	}
	return true
}

// Cut cuts an observed change at the limits of the declarations that matter to it,
// of all that there are. Neighbouring pieces differ in By or RunOut.
func Cut(o *Observed, declared []Declared) []Piece {
	o.prepare(declared)
	type claim struct {
		from, to unit.Distance
		by       int
		runOut   bool
	}
	var plain, runOuts []claim
	limits := []unit.Distance{o.From, o.To}
	for i := range declared {
		d := &declared[i]
		if !d.allows(o) {
			continue
		}
		plain = append(plain, claim{d.From, d.To, i, false})
		limits = append(limits, d.From, d.To)
		for _, x := range d.runOut(o) {
			runOuts = append(runOuts, claim{x.From, x.To, i, true})
			limits = append(limits, x.From, x.To)
		}
	}
	// A plain claim counts before one by run-out.
	claims := append(plain, runOuts...)
	slices.Sort(limits)
	limits = slices.Compact(limits)
	var pieces []Piece
	for k := range len(limits) - 1 {
		from, to := limits[k], limits[k+1]
		if from < o.From || to > o.To {
			continue
		}
		p := Piece{From: from, To: to, By: Outside}
		for _, c := range claims {
			if c.from <= from && to <= c.to {
				p.By, p.RunOut = c.by, c.runOut
				break
			}
		}
		if n := len(pieces); n > 0 && pieces[n-1].By == p.By && pieces[n-1].RunOut == p.RunOut {
			pieces[n-1].To = to
			continue
		}
		pieces = append(pieces, p)
	}
	return pieces
}

// Seen gives how much of an observed change a declaration holds: by its own
// range, and as run-out past its far end. Before, Cut has to have looked at all
// declarations.
func Seen(o *Observed, d *Declared) (inside, runOut unit.Distance) {
	if !d.allows(o) {
		return 0, 0
	}
	inside = overlap(o, d.From, d.To)
	for _, x := range d.runOut(o) {
		runOut += overlap(o, x.From, x.To)
	}
	return inside, runOut
}

// SeenBoth gives what of Seen a declaration holds of other changes in the same
// place, too, which stand in their order and of which none overlaps another.
func SeenBoth(o *Observed, others []Observed, d *Declared) (inside, runOut unit.Distance) {
	if !d.allows(o) {
		return 0, 0
	}
	first := sort.Search(len(others), func(i int) bool { return others[i].To > o.From })
	for i := first; i < len(others) && others[i].From < o.To; i++ {
		x := &others[i]
		if !d.allows(x) {
			continue
		}
		both := Observed{From: max(x.From, o.From), To: min(x.To, o.To)}
		inside += overlap(&both, d.From, d.To)
		for _, own := range d.runOut(o) {
			for _, other := range d.runOut(x) {
				runOut += overlap(&both, max(own.From, other.From), min(own.To, other.To))
			}
		}
	}
	return inside, runOut
}

func overlap(o *Observed, from, to unit.Distance) unit.Distance {
	return max(0, min(o.To, to)-max(o.From, from))
}
