// Package doubt looks for data that obeys every rule of a data set and is
// doubtful all the same: places that a data engineer would want to be asked
// about. It never corrects and never accuses; each kind has an id by which
// accepted.toml can accept it.
//
//	for _, d := range doubt.Check(route, dataset, at) {
//		d.ID // "category-order"
//	}
//
// Checks that differ from network to network are switched on by limits of
// dataset.toml.
package doubt

import (
	"cmp"
	"slices"
	"strings"
	"time"

	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// The ids of what is looked for. They are an interface: accepted.toml names
// them.
const (
	CurveSpeed        = "curve-speed"
	CantExcess        = "cant-excess"
	CategoryOrder     = "category-order"
	AxleLoadOrder     = "axle-load-order"
	AxleLoadMissing   = "axle-load-missing"
	ShortStretch      = "short-stretch"
	StepSize          = "step-size"
	TemporaryExpired  = "temporary-expired"
	TemporaryNoEffect = "temporary-without-effect"
	DelayOverBridge   = "delay-over-bridge"
	DelayOneSided     = "delay-one-sided"
	CrossingWarning   = "crossing-warning"
)

// IDs lists them, first a train that is too fast on a curve and road users who are
// warned too late.
var IDs = []string{CurveSpeed, CrossingWarning, CantExcess, CategoryOrder, AxleLoadOrder, AxleLoadMissing, ShortStretch, StepSize,
	TemporaryExpired, TemporaryNoEffect, DelayOverBridge, DelayOneSided}

// Doubt is one doubtful place.
type Doubt struct {
	ID         string
	Directions codes.Directions
	From, To   unit.Distance   // running distance; equal for a point
	Row        source.Position // the row to look at
	Text       string          // what is doubtful, without the place
	// Key is Text without the line of another row that it names: rows move up and
	// down in a table, and the doubt stays the same.
	Key string
}

// other stands in a text for another row, which a reader is to find and which the
// doubt does not depend on.
const other = "\x00"

// named puts another row into the text of a doubt.
func named(d Doubt, row string) Doubt {
	d.Text, d.Key = strings.ReplaceAll(d.Text, other, row), strings.ReplaceAll(d.Text, other, "")
	return d
}

// Check looks at a route of a data set. at is the time that validities are
// compared with.
func Check(route *schema.Route, d *schema.Dataset, at time.Time) []Doubt {
	c := &check{route: route, trains: d.Trains, limits: d.Limits, at: at, speeds: newSpeeds(route.Speed)}
	c.speedRows()
	c.axleLoadRows()
	c.temporaryRows()
	c.curves()
	c.delays()
	c.steps()
	c.crossings()
	for i := range c.list {
		if d := &c.list[i]; d.Key == "" {
			d.Key = d.Text
		}
	}
	slices.SortStableFunc(c.list, func(a, b Doubt) int {
		return cmp.Or(cmp.Compare(a.From, b.From), cmp.Compare(a.To, b.To), cmp.Compare(slices.Index(IDs, a.ID), slices.Index(IDs, b.ID)),
			a.Row.Compare(b.Row), cmp.Compare(a.Text, b.Text))
	})
	return slices.Compact(c.list)
}

type check struct {
	route  *schema.Route
	trains []schema.Train
	limits schema.Limits
	at     time.Time
	speeds speeds
	list   []Doubt
}

func (c *check) add(id string, row *schema.Row, text string) {
	c.list = append(c.list, Doubt{ID: id, Directions: row.Directions & c.route.Directions, From: row.Start, To: row.End, Row: row.Pos, Text: text})
}

// longest is the length of the longest reference train.
func (c *check) longest() (longest unit.Distance) {
	for _, t := range c.trains {
		longest = max(longest, t.Length)
	}
	return longest
}
