// Package diff compares two revisions of a data set by what they mean: which
// trains are faster or slower, where, because of which source rows, and whether
// change requests declare it.
//
// It refuses requests that name what does not exist; of everything else that
// schema has read it gives an account, and states what it does not look at.
// Results are in one order everywhere: route (by id), direction (nominal
// first), position along the nominal direction, train (by id).
//
//	account, err := diff.Compare(ctx, base, target, diff.Options{})
//	for _, route := range account.Routes {
//		for _, change := range route.Changes { ... }
//	}
package diff

import (
	"speedtrail/diff/profile"
	"speedtrail/diff/scope"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// RulesVersion is raised whenever the same data can give another result.
const RulesVersion = 7

// Account is all that differs between two revisions of a data set.
type Account struct {
	Trains []Train // those of either revision, by id
	Routes []Route // those whose files differ, by id
	Equal  int     // how many route folders hold the same files in both
	// Frame are the differences of the files that belong to no route.
	Frame []File
	// Requests are the change requests in play, by id, and Declared what they
	// declare, in their order. Reconciled is false where that was left out.
	Requests   []schema.ChangeRequest
	Declared   []Declared
	Reconciled bool
	// Stretches are pictures of the changes, in the order of Routes: where there are
	// more than StretchLimit, of those with the largest steps. StretchesLeftOut counts
	// the others.
	Stretches        []Stretch
	StretchesLeftOut int
}

// Fate says what became of a thing between base and target.
type Fate uint8

// The fates of trains and routes.
const (
	Kept Fate = iota
	Added
	Removed
	Altered
)

// String gives a plain word.
func (f Fate) String() string { return [...]string{"kept", "added", "removed", "altered"}[f] }

// Train is a reference train of a comparison. Both sides are compiled for the
// same definition, so that a change of trains.toml cannot look like a change of
// the track.
type Train struct {
	schema.Train // as in the target, or as in the base for one that only it has
	Fate         Fate
	Before       schema.Train // the base's definition, where Fate is Altered
	// Declared tells, for a train that is not Kept, whether a declaration of
	// any effect names it.
	Declared bool
}

// Route is what differs on one route.
type Route struct {
	ID           string
	Base, Target *schema.Route // nil for a route that was added or removed
	Track        []TrackChange // in order of direction, removed before added, and position
	Changes      []Change
	// Masked are changes that would appear if no temporary restriction were in
	// force on either side, and are not among Changes.
	Masked []Change
	// Sources are the distinct lists of governing rows, Causes the distinct
	// lists of differences (file and row) and Pieces the distinct ways in which
	// declarations hold a change, that the changes refer to.
	Sources [][]profile.Source
	Causes  [][]Cause
	Pieces  [][]scope.Piece
	Files   []File // that differ, by path
	Leaving []Leaving
	Dated   []Dated
	Fleet   []Fleet
	Figures Figures

	sources    sourceTable
	causes     causeTable
	pieces     map[string]int
	alike      map[leavingKey]bool // see carriesAlike
	held       map[codes.Direction][]heldRow
	neighbours neighbours
}

// TrackChange is a chainage or a direction of travel that only one revision
// has. It is not a speed change.
type TrackChange struct {
	Direction codes.Direction
	Fate      Fate          // Added or Removed
	From, To  unit.Distance // running distance: on the target's track if added, on the base's if removed
	Pieces    int           // index in Route.Pieces
}

// Change is a maximal stretch over which the speed before, the speed after and
// RunOut are constant, and before and after differ.
type Change struct {
	Direction     codes.Direction
	From, To      unit.Distance // running distance on the target's track
	Train         int           // index in Account.Trains
	Before, After unit.Speed
	// RunOut: a train of no length would see no change here.
	RunOut bool
	// Indices in Route.Sources of the rows that govern before and after.
	BeforeSources, AfterSources int
	Causes                      int // index in Route.Causes
	Pieces                      int // index in Route.Pieces
}

// Length is the running distance of the change.
func (c Change) Length() unit.Distance { return c.To - c.From }

// Raised tells whether the change is one to a higher speed.
func (c Change) Raised() bool { return c.After > c.Before }

// Same tells whether two changes differ only in the train.
func (c Change) Same(d Change) bool {
	c.Train = d.Train
	return c == d
}
