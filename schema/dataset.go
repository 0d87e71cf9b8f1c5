// Package schema holds what is written in a data set of route speed data, and
// reads it.
package schema

import (
	"time"

	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// Format is the number of the data set format that is read.
const Format = 1

// Dataset is one state of a data set. It does not change after it was read.
type Dataset struct {
	Name     string
	TimeZone *time.Location // for bare dates; never nil, UTC unless given
	Limits   Limits
	Trains   []Train         // in the order of trains.toml
	Routes   []*Route        // in the byte order of their ids
	Requests []ChangeRequest // in the byte order of their ids
	Accepted []Acceptance    // in the order of accepted.toml
	// Policy is nil where the data set has none.
	Policy *Policy
	// Unread lists the folders of routes that LoadPair left out because both
	// revisions hold the same files there, in byte order. Load leaves out none.
	Unread []Folder
	// Files lists every file that was read with its content, in byte order of
	// the paths.
	Files []File
}

// Folder is a route folder by its path and the identity of its content (the
// hash of its Git tree).
type Folder struct {
	Path, Identity string
}

// File is one file of a data set as it was read.
type File struct {
	Path    string // slash-separated, from the data set's folder
	Content []byte
}

// Limits are the optional checks of dataset.toml; 0 switches a check off.
type Limits struct {
	CantExcessMM    int
	LargestStep     unit.Speed
	ShortestStretch unit.Distance
}

// ChangeRequest is what a change declares that it touches.
type ChangeRequest struct {
	Pos     source.Position // of the id
	ID      string
	Title   string
	Reason  string
	Declare []Declaration
}

// Declaration is one [[declares]] of a change request. Its positions are kept
// as they are written: they are located on the route of a revision only when
// the request is in play.
type Declaration struct {
	Pos    source.Position // of the [[declares]]
	Route  string
	Span   Span
	Effect Effect
	Trains []string // ids; empty: every train
	Places Places
}

// Places are where the values of a declaration or of an acceptance stand.
type Places struct {
	Finding, Route, From, To source.Position
	Trains                   []source.Position // in the order of the trains
}

// Effect is the sense that a declaration allows.
type Effect uint8

// The senses of a declaration.
const (
	AnyEffect Effect = iota
	Raise
	Lower
)

// String gives "any", "raise" or "lower".
func (e Effect) String() string { return [...]string{"any", "raise", "lower"}[e] }

// Acceptance is one entry of accepted.toml: a kind of finding that was looked
// at and accepted on a stretch, or at a point where From and To are the same.
type Acceptance struct {
	Pos     source.Position
	Finding string // id of the finding
	Route   string
	Span    Span
	Reason  string
	Until   string // local date YYYY-MM-DD, the last day on which it counts; empty: no end
	Places  Places
}
