// Package assessment makes the document of an assessment: everything that was
// computed about two revisions of a data set, and from what, in a form that is
// stored in the ledger and from which every report is written.
//
// The stored bytes are RFC 8785 JSON. The part "computed" has a digest, which
// is the same wherever and whenever the same two revisions are assessed by the
// same rules:
//
//	digest = SHA-256("speedtrail-assessment 1\n" computed)
//
// in lower-case hex, "computed" being the canonical JSON of that member. The
// names that were typed stand beside it and are not in the digest.
//
// Lengths in members whose names end in _mm are whole millimetres; from_km and
// to_km are positions as they are written in a data set, with # where posts
// repeat. Running distances count from the start of the target's track.
package assessment

// Format names the form of a Document.
const Format = "speedtrail-assessment 1"

// Document is an assessment. The fields of every type in this file stand in
// the order of their JSON names, which is the canonical one.
type Document struct {
	Computed Computed `json:"computed"`
	Format   string   `json:"format"`
	Named    Named    `json:"named"`
}

// Asked gives the part of a document that says what was assessed, and how: the
// folder, the revisions, the options and the version of the rules. Of thousands of
// assessments to be computed anew, no more is kept.
func (d *Document) Asked() *Document {
	c := &d.Computed
	return &Document{Format: d.Format, Named: d.Named, Computed: Computed{Base: c.Base, Folder: c.Folder, Options: c.Options, PreparedSince: c.PreparedSince, RulesVersion: c.RulesVersion, Target: c.Target}}
}

// Named is how the revisions were called; it is not in the digest.
type Named struct {
	Base       string `json:"base"`        // as typed
	BaseName   string `json:"base_name"`   // a tag or branch that points to it, or empty
	Target     string `json:"target"`      // as typed
	TargetName string `json:"target_name"` // a tag or branch that points to it, or empty
}

// Computed is all that the digest covers.
type Computed struct {
	Accepted    []Acceptance  `json:"accepted"` // the entries of the target's accepted.toml
	At          string        `json:"at"`       // the time that validities are compared with, RFC 3339
	Base        Revision      `json:"base"`
	Dataset     string        `json:"dataset"`      // the target's name of the data set
	EqualRoutes int           `json:"equal_routes"` // routes whose files are the same
	Explained   []Explanation `json:"explained"`    // the kinds of finding that occur, in their order
	Figures     Figures       `json:"figures"`
	Files       []File        `json:"files"`
	Findings    []Finding     `json:"findings"` // in the order in which to look at them
	Fleet       []Fleet       `json:"fleet"`
	Folder      string        `json:"folder"` // the data set's folder in the repository, "." for its root
	Limits      Limits        `json:"limits"`
	Options     Options       `json:"options"`
	Policy      Policies      `json:"policy"`
	// PreparedSince is the commit from which preparers are counted, where that is not
	// the base: the approved commit of the base's content.
	PreparedSince string       `json:"prepared_since"`
	Preparers     []Person     `json:"preparers"`
	Requests      []Request    `json:"requests"` // in play
	Routes        []Route      `json:"routes"`   // that differ
	RulesVersion  int          `json:"rules_version"`
	Source        []SourceFile `json:"source"`
	Stretches     Stretches    `json:"stretches"`
	Target        Revision     `json:"target"`
	Trains        []Train      `json:"trains"`
}

// Revision is one side of an assessment. For the working tree, Commit is empty.
type Revision struct {
	Author    Person `json:"author"`
	Commit    string `json:"commit"` // full hash
	Committed string `json:"committed"`
	Subject   string `json:"subject"`
	Tree      string `json:"tree"` // hash of the data set folder's Git tree: its content
}

// Policies are the policies of both sides.
type Policies struct {
	Base   Policy `json:"base"`   // decides about this change
	Target Policy `json:"target"` // decides about later ones, once this one is approved
}

// Policy is the content of the two policy files, empty where there is none.
type Policy struct {
	AllowedSigners string `json:"allowed_signers"`
	SignOff        string `json:"signoff"`
}

// Person is a name and an e-mail address as commits carry them: a claim.
type Person struct {
	Email string `json:"email"`
	Name  string `json:"name"`
}

// String gives name and address, and says which of them a commit does not have.
func (p Person) String() string {
	switch {
	case p.Name == "" && p.Email == "":
		return "somebody without name and address"
	case p.Email == "":
		return p.Name + " (no address)"
	case p.Name == "":
		return "<" + p.Email + ">"
	}
	return p.Name + " <" + p.Email + ">"
}

// Options are the options that can change a result.
type Options struct {
	NoRequests bool     `json:"no_requests"` // the reconciliation was left out
	Requests   []string `json:"requests"`    // ids given with --request; empty: those added or altered
	Rolling    bool     `json:"rolling"`     // running times begin and end at speed
}

// Limits are the limits of dataset.toml by which doubtful data is looked for, of each
// the stricter of both revisions; 0 where neither sets it.
type Limits struct {
	CantExcess      int   `json:"cant_excess_mm"`
	LargestStep     int   `json:"largest_step_kmh"`
	ShortestStretch int64 `json:"shortest_stretch_mm"`
	// Unchecked are the findings that nobody looked for, as their limit is not set.
	Unchecked []string `json:"unchecked"`
}

// File is a file that was read on at least one side, with the SHA-256 of its
// bytes in lower-case hex, empty where it does not exist.
type File struct {
	Base   string `json:"base_sha256"`
	Path   string `json:"path"`
	Target string `json:"target_sha256"`
}

// Finding is something that needs eyes.
type Finding struct {
	Accepted string `json:"accepted"` // reason, where accepted.toml of the base accepts it
	// AlsoInBase tells that the base has the same doubtful data in the same place,
	// by its own trains and limits and at the time of the target: the change did not
	// bring it.
	AlsoInBase bool   `json:"also_in_base"`
	Direction  string `json:"direction"`
	Example    string `json:"example"` // lines for a file of the data set, where they help
	From       string `json:"from_km"`
	ID         string `json:"id"`
	Route      string `json:"route"`
	Row        string `json:"row"`  // path:line of the row or rows behind it
	Text       string `json:"text"` // what, without the place
	To         string `json:"to_km"`
}

// Explanation says of a kind of finding why it matters and what to do.
type Explanation struct {
	Do string `json:"do"`
	ID string `json:"id"`
	// Why it matters.
	Why string `json:"why"`
}

// Acceptance is an entry of accepted.toml.
type Acceptance struct {
	Covers  int    `json:"covers"` // how many findings
	Finding string `json:"finding"`
	From    string `json:"from_km"`
	Line    int    `json:"line"`
	Reason  string `json:"reason"`
	Route   string `json:"route"`
	// State tells whether it counts: used; unused; new (it does not stand
	// unaltered in the base); over (past its last day); never (such a finding
	// cannot be accepted); unread (its route is the same in both revisions).
	State string `json:"state" jsonschema:"enum=used,enum=unused,enum=new,enum=over,enum=never,enum=unread"`
	To    string `json:"to_km"`
	Until string `json:"until"`
}

// Request is a change request in play.
type Request struct {
	Declares []Declaration `json:"declares"`
	File     string        `json:"file"`
	ID       string        `json:"id"`
	Reason   string        `json:"reason"`
	Title    string        `json:"title"`
}

// Declaration is one stretch that a request declares, and what of it was seen.
type Declaration struct {
	Dated     int64    `json:"dated_mm"` // where temporary restrictions hold at other times, in its sense
	Direction string   `json:"direction" jsonschema:"enum=nominal,enum=reverse,enum=both"`
	Effect    string   `json:"effect" jsonschema:"enum=raise,enum=lower,enum=any"`
	From      string   `json:"from_km"`
	Line      int      `json:"line"`
	Route     string   `json:"route"`
	Seen      []Seen   `json:"seen"`
	To        string   `json:"to_km"`
	Track     int64    `json:"track_mm"` // added and removed track that it holds
	Trains    []string `json:"trains"`   // empty: every train
	Unseen    bool     `json:"unseen"`   // nothing of it was observed
}

// Seen is how much a train was seen to change inside a declaration, over both
// directions of travel.
type Seen struct {
	Hidden int64  `json:"hidden_mm"` // today, by temporary restrictions: not in the others
	Inside int64  `json:"inside_mm"`
	RunOut int64  `json:"run_out_mm"` // past the far end, inside as run-out
	Train  string `json:"train"`
}

// Route is what differs on one route.
type Route struct {
	Causes       [][]Cause    `json:"causes"`
	Changes      []Change     `json:"changes"`
	End          string       `json:"end_km"`
	Fate         string       `json:"fate" jsonschema:"enum=kept,enum=added,enum=removed"` // kept, added, removed
	Folder       string       `json:"folder"`
	FolderBefore string       `json:"folder_before"` // where it differs, else empty
	ID           string       `json:"id"`
	Masked       []Change     `json:"masked"` // hidden today by temporary restrictions
	Name         string       `json:"name"`
	NameBefore   string       `json:"name_before"` // where it differs, else empty
	Pieces       [][]Piece    `json:"pieces"`
	Sources      [][]Source   `json:"sources"`
	Start        string       `json:"start_km"`
	Track        []TrackPiece `json:"track"`
}

// Change is a stretch on which some trains see the same change.
type Change struct {
	After        int    `json:"after_kmh"`
	AfterSource  int    `json:"after_source"` // index in Route.Sources
	Before       int    `json:"before_kmh"`
	BeforeSource int    `json:"before_source"`
	Cause        int    `json:"cause"` // index in Route.Causes
	Direction    string `json:"direction" jsonschema:"enum=nominal,enum=reverse"`
	From         string `json:"from_km"`
	Length       int64  `json:"length_mm"`
	Pieces       int    `json:"pieces"` // index in Route.Pieces
	RunOut       bool   `json:"run_out"`
	Start        int64  `json:"start_mm"` // running distance of From
	To           string `json:"to_km"`
	Trains       []int  `json:"trains"` // indices in Computed.Trains, ascending
}

// Cause is a difference of the source that a change comes of.
type Cause struct {
	File int `json:"file"` // index in Computed.Source
	Row  int `json:"row"`  // index in SourceFile.Rows
}

// Piece is a part of a change, or of track that only one side has, and the
// declaration that holds it. A change with an empty list of pieces is outside
// all declarations.
type Piece struct {
	By     int    `json:"by"` // declaration, counted over all requests from 0; -1: none
	From   string `json:"from_km"`
	Length int64  `json:"length_mm"`
	RunOut bool   `json:"run_out"` // inside only as run-out past the far end
	Start  int64  `json:"start_mm"`
	To     string `json:"to_km"`
}

// Source is a row that governs a speed.
type Source struct {
	File  string `json:"file"`
	Kind  string `json:"kind"`
	Line  int    `json:"line"`
	Value int    `json:"value_kmh"`
}

// TrackPiece is track or a direction of travel that only one side has.
type TrackPiece struct {
	Direction string `json:"direction" jsonschema:"enum=nominal,enum=reverse"`
	Fate      string `json:"fate" jsonschema:"enum=added,enum=removed"` // added or removed
	From      string `json:"from_km"`
	Length    int64  `json:"length_mm"`
	Pieces    int    `json:"pieces"` // index in Route.Pieces
	To        string `json:"to_km"`
}

// Train is a reference train with what the change does to it over all routes.
// Lengths are added up over both directions of travel.
type Train struct {
	After            *Definition `json:"after" jsonschema:"nullable"`                                      // null where the target has no such train
	Before           *Definition `json:"before" jsonschema:"nullable"`                                     // null where the base has no such train
	Declared         bool        `json:"declared"`                                                         // of one that is not kept: a request in play declares it
	Fate             string      `json:"fate" jsonschema:"enum=kept,enum=added,enum=removed,enum=altered"` // kept, added, removed, altered
	ID               string      `json:"id"`
	LargestRaise     int         `json:"largest_raise_kmh"`
	LargestReduction int         `json:"largest_reduction_kmh"`
	Lowered          int64       `json:"lowered_mm"`
	Raised           int64       `json:"raised_mm"`
	Routes           []string    `json:"routes"` // ids of the routes on which it sees a change
}

// Definition is a train as trains.toml defines it.
type Definition struct {
	Acceleration   string   `json:"acceleration_ms2"` // decimal, empty: not given
	AxleLoad       string   `json:"axle_load"`
	Braking        string   `json:"braking_ms2"`
	CantDeficiency int      `json:"cant_deficiency_mm"`
	Categories     []string `json:"categories"`
	Length         int64    `json:"length_mm"`
	MaxSpeed       int      `json:"max_speed_kmh"`
	Name           string   `json:"name"`
}

// Stretches are the pictures of the changes: changes of one direction of a
// route that lie close together, and the trains that see the same there.
type Stretches struct {
	LeftOut int       `json:"left_out"` // pictures beyond the limit; their changes stand in Routes
	List    []Stretch `json:"list"`
}

// Stretch is what one chart shows. All distances are running distances on the
// target's track.
type Stretch struct {
	After       []Step    `json:"after"`
	Before      []Step    `json:"before"`  // with gaps where the base has no track
	Changes     []int     `json:"changes"` // of the first of the trains; others can have theirs declared otherwise
	Direction   string    `json:"direction" jsonschema:"enum=nominal,enum=reverse"`
	From        int64     `json:"from_mm"` // of the changes
	Places      []Place   `json:"places"`
	Route       int       `json:"route"` // index in Computed.Routes
	RouteLength int64     `json:"route_length_mm"`
	Segments    []Segment `json:"segments"` // the chainage within the window
	To          int64     `json:"to_mm"`
	Trains      []int     `json:"trains"`
	WindowFrom  int64     `json:"window_from_mm"`
	WindowTo    int64     `json:"window_to_mm"`
}

// Step is a piece of a profile in a chart.
type Step struct {
	From   int64 `json:"from_mm"`
	Source int   `json:"source"` // index in Route.Sources
	Speed  int   `json:"speed_kmh"`
	To     int64 `json:"to_mm"`
}

// Place is a named place in a chart.
type Place struct {
	From int64  `json:"from_mm"`
	Kind string `json:"kind"`
	Name string `json:"name"`
	To   int64  `json:"to_mm"` // equal to From for one without an extent
}

// Segment is a piece of track with steady chainage in a chart.
type Segment struct {
	Chainage int64 `json:"chainage_mm"` // at From
	From     int64 `json:"from_mm"`
	To       int64 `json:"to_mm"`
}
