package schema

import (
	"slices"
	"time"

	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// Route is one line, or one track of it where tracks differ.
type Route struct {
	Pos        source.Position // of the id in route.toml
	Folder     string          // "routes/..." from the data set's folder
	ID, Name   string
	Track      *chainage.Track
	StartPos   source.Position // of start_km
	EndPos     source.Position // of end_km
	Jumps      []JumpRow       // in the order of the track
	Directions codes.Directions

	Speed     []SpeedRow // in the order of the file, as all tables
	AxleLoad  []AxleLoadRow
	Temporary []TemporaryRow
	Curves    []CurveRow
	Gradients []GradientRow
	Places    []PlaceRow
}

// Clone gives a route with tables of its own.
func (r *Route) Clone() *Route {
	out := *r
	out.Speed, out.AxleLoad, out.Temporary = slices.Clone(r.Speed), slices.Clone(r.AxleLoad), slices.Clone(r.Temporary)
	out.Curves, out.Gradients, out.Places = slices.Clone(r.Curves), slices.Clone(r.Gradients), slices.Clone(r.Places)
	return &out
}

// JumpRow is a [[jump]] of route.toml with its place in the file.
type JumpRow struct {
	Pos source.Position
	chainage.Jump
}

// Span is a stretch of track as it is written, for some directions of travel.
type Span struct {
	From, To   chainage.Point
	Directions codes.Directions
}

// Row is what the rows of all tables have in common.
type Row struct {
	Pos source.Position // of the row's first cell
	Span
	// Start and End are the running distances of From and To: the row covers
	// Start <= s < End. Start < End, but for a place without extent.
	Start, End unit.Distance
	// Delay tells whether the restriction holds until the rear of the train
	// has left the stretch (train length delay, SUBSET-026 Q_FRONT 0).
	Delay bool
	Note  string
}

// SpeedRow is a row of speed.csv: an element of the static speed profile
// (SUBSET-026 3.11.3). Speeds that are not given are 0.
type SpeedRow struct {
	Row
	Basic    unit.Speed
	Cant     [codes.CantDeficiencies]unit.Speed
	Other    [codes.Categories]unit.Speed
	Replaces [codes.Categories]bool // SUBSET-026 Q_DIFF 1; else Q_DIFF 2
}

// AxleLoadRow is a row of axle-load.csv (SUBSET-026 3.11.4). Categories
// without a restriction are 0.
type AxleLoadRow struct {
	Row
	Limit [codes.AxleLoads]unit.Speed
}

// TemporaryRow is a row of temporary.csv (SUBSET-026 3.11.5).
type TemporaryRow struct {
	Row
	ID     string
	Speed  unit.Speed
	Valid  Validity
	Reason string
}

// Validity is the time in which a temporary restriction is in force, as it is
// written and as instants: From <= t < Until. A zero time is no bound.
type Validity struct {
	WrittenFrom, WrittenTo string
	From, Until            time.Time
}

// Overlaps tells whether the restriction is in force at any instant of
// from <= t < until; for until == from, at that instant.
func (v Validity) Overlaps(from, until time.Time) bool {
	if !v.Until.IsZero() && !v.Until.After(from) {
		return false
	}
	if until.Equal(from) {
		return !v.From.After(from)
	}
	return v.From.Before(until)
}

// CurveRow is a row of curves.csv.
type CurveRow struct {
	Row
	RadiusM int    // metres, at least 1
	CantMM  int    // millimetres
	Hand    string // "left", "right" or empty
}

// GradientRow is a row of gradients.csv.
type GradientRow struct {
	Row
	Slope int // millionths (thousandths of a per mille), uphill positive in the nominal direction
}

// PlaceRow is a row of places.csv; Start == End for one without an extent.
type PlaceRow struct {
	Row
	Kind      PlaceKind
	Name      string
	StrikeIn  unit.Distance // crossing: the running distance before it; 0: not given
	WarningDS int           // crossing: needed warning time in tenths of a second; 0: not given
}

// PlaceKind is the kind of a place.
type PlaceKind string

// The kinds of place.
const (
	Station  PlaceKind = "station"
	Crossing PlaceKind = "crossing"
	Bridge   PlaceKind = "bridge"
	Tunnel   PlaceKind = "tunnel"
	Junction PlaceKind = "junction"
	Signal   PlaceKind = "signal"
	Other    PlaceKind = "other"
)
