// Package diff compares two revisions of a data set by what they mean: which
// reference trains are faster or slower, where, and because of which source
// rows.
//
// It refuses nothing that schema has read; it states what it does not look at.
// Results are in one order everywhere: route (by id), direction (nominal
// first), position along the nominal direction, train (by id).
//
//	account, err := diff.Compare(ctx, base, target)
//	for _, route := range account.Routes {
//		for _, change := range route.Changes { ... }
//	}
package diff

import (
	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// RulesVersion is raised whenever the same data can give another result.
const RulesVersion = 1

// Account is all that differs between two revisions of a data set.
type Account struct {
	Trains []Train // those of either revision, by id
	Routes []Route // those whose files differ, by id
	Equal  int     // how many route folders hold the same files in both
	// Requests are the change requests in play, by id.
	Requests []schema.ChangeRequest
	// Stretches are pictures of the changes, at most about StretchLimit, in
	// the usual order; StretchesLeftOut counts those beyond.
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
}

// Route is what differs on one route.
type Route struct {
	ID           string
	Base, Target *schema.Route // nil for a route that was added or removed
	Track        []TrackChange // in order of direction and position
	Changes      []Change
	// Sources are the distinct lists of governing rows that the changes refer
	// to.
	Sources [][]profile.Source

	sources sourceTable
}

// TrackChange is a chainage or a direction of travel that only one revision
// has. It is not a speed change.
type TrackChange struct {
	Direction codes.Direction
	Fate      Fate          // Added or Removed
	From, To  unit.Distance // running distance: on the target's track if added, on the base's if removed
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
