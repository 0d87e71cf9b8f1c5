package render

import (
	"encoding/csv"
	"fmt"
	"io"
	"strconv"
	"strings"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

const traceJSONFormat = "speedtrail-trace 1"

// Trace is what a trace found: the trails of a point, or the stretches with the
// revision that each piece dates from. Commits are listed once and referred to
// by their index.
type Trace struct {
	At          string               `json:"at_km"` // of a point
	Caution     string               `json:"caution"`
	Commits     []TraceCommit        `json:"commits"` // the newest first
	Cut         []int                `json:"cut"`     // commits at which a shallow clone ends
	FirstParent bool                 `json:"first_parent"`
	Folder      string               `json:"folder"`
	Format      string               `json:"format"`
	From        string               `json:"from_km"` // of a stretch
	Gaps        []TraceGap           `json:"gaps"`    // revisions whose data set does not load, the newest first
	Places      []assessment.Place   `json:"places"`
	Revision    TraceRevision        `json:"revision"` // the newest one
	Route       string               `json:"route"`
	RouteName   string               `json:"route_name"`
	Segments    []assessment.Segment `json:"segments"`
	Stretches   []TraceStretch       `json:"stretches"`
	To          string               `json:"to_km"`
	Trails      []TraceTrail         `json:"trails"`
}

// TraceRevision is the revision that positions and trains are read from.
type TraceRevision struct {
	Commit    string `json:"commit"`
	Committed string `json:"committed"`
	Typed     string `json:"typed"`
}

// TraceCommit is a commit that a trace names.
type TraceCommit struct {
	Anchor   string `json:"anchor"`    // the entry that made it the root of the line of approval, SEQ:HASH; empty: it is not
	InAnchor string `json:"in_anchor"` // the entry of an anchor whose revision descends from the commit, SEQ:HASH; else empty
	// AnchorSignOffs are the statements of either anchor, "checker m.okoro@harbourline.example".
	AnchorSignOffs []string          `json:"anchor_sign_offs"`
	AnchorRevoked  []RevokedSignOff  `json:"anchor_revoked"` // of anchor_sign_offs, those by keys that were revoked later
	Assessments    []TraceAssessment `json:"assessments"`    // whose range holds the commit; none: it is not assessed
	Author         assessment.Person `json:"author"`
	Authored       string            `json:"authored"`
	Committed      string            `json:"committed"`
	Hash           string            `json:"hash"`
	Requests       []TraceRequest    `json:"requests"` // in play between the commit and its first parent
	Subject        string            `json:"subject"`
}

// TraceAssessment is a recorded assessment.
type TraceAssessment struct {
	// Beyond tells that its target is no part of the history that is traced, so that
	// nobody sees here what it judged.
	Beyond   bool             `json:"beyond"`
	Number   int64            `json:"number"`
	Revoked  []RevokedSignOff `json:"revoked"`   // of sign_offs, those by keys that were revoked later
	SignOffs []string         `json:"sign_offs"` // "approve checker m.okoro@harbourline.example"
	State    string           `json:"state"`
}

// words says where it stands, and who signed it.
func (a *TraceAssessment) words() []string {
	words := []string{a.State}
	if a.Beyond {
		words = append(words, "! of a target that is not in this history")
	}
	return append(words, WithRevoked(a.SignOffs, a.Revoked)...)
}

// TraceRequest is a change request.
type TraceRequest struct {
	ID    string `json:"id"`
	Title string `json:"title"`
}

// TraceGap is a revision whose data set does not load.
type TraceGap struct {
	Commit int    `json:"commit"` // index in commits
	Fault  string `json:"fault"`  // the first one
}

// TraceTrail is the past of a point for trains that see the same.
type TraceTrail struct {
	Direction string       `json:"direction"`
	Line      []TraceReign `json:"line"` // along first parents, the oldest first
	Now       TraceValue   `json:"now"`
	Steps     []TraceStep  `json:"steps"` // the newest first
	Trains    []string     `json:"trains"`
}

// TraceReign is a run of revisions on the line of first parents of one speed.
type TraceReign struct {
	Committed string `json:"committed"` // of the first of them
	Gap       bool   `json:"gap"`       // they do not load
	Speed     int    `json:"speed_kmh"` // 0: no such track
}

// TraceStep is a revision at which the speed changed.
type TraceStep struct {
	// AnchorOvertaken: the newest revision has this speed because of it, and that of the
	// anchor, which came later, has not.
	AnchorOvertaken bool         `json:"anchor_overtaken"`
	Across          int          `json:"across"` // revisions that do not load between it and what was before
	After           TraceValue   `json:"after"`
	Aside           bool         `json:"aside"`  // a later merge did not take it
	Before          []TraceValue `json:"before"` // of the parents, each speed once; empty where the history begins
	// DeclaredBy are the requests in play that declare the change at this place for these
	// trains; run-out beyond the end of a declaration is not looked at.
	DeclaredBy []string `json:"declared_by"`
	// Overtaken are the assessments of its commit that did not judge this speed: a later
	// commit of the same range altered it, or a merge did not take it.
	Overtaken []int64 `json:"overtaken"`
}

// TraceValue is the speed at a revision with the rows that govern it there.
type TraceValue struct {
	Commit  int                 `json:"commit"` // index in commits
	Sources []assessment.Source `json:"governed_by"`
	Speed   int                 `json:"speed_kmh"` // 0: no such track
}

// TraceStretch is a stretch of today's profile for trains that see the same.
type TraceStretch struct {
	Bands     []TraceBand  `json:"bands"` // along first parents, the oldest first
	Direction string       `json:"direction"`
	LeftOut   int          `json:"bands_left_out"` // older ones that are not listed
	Pieces    []TracePiece `json:"pieces"`
	Trains    []string     `json:"trains"`
}

// TracePiece is a piece of one speed that dates from one revision.
type TracePiece struct {
	// AnchorOvertaken: that of the anchor, which came later than its revision, has not
	// this speed because of it on all of the piece.
	AnchorOvertaken bool         `json:"anchor_overtaken"`
	Across          int          `json:"across"` // revisions that do not load between its revision and what was before
	Before          []TraceLevel `json:"before"` // in the first parent of its revision
	// DeclaredBy are the requests in play that declare all of what changed here for
	// these trains; run-out beyond the end of a declaration is not looked at.
	DeclaredBy []string `json:"declared_by"`
	// DeclaredInPart are those that declare some of it.
	DeclaredInPart []string `json:"declared_in_part_by"`
	End            int64    `json:"end_mm"` // running distance
	From           string   `json:"from_km"`
	Origin         int      `json:"origin"` // index in commits
	// Overtaken are the assessments of its revision whose target has not this speed
	// because of it on all of the piece: they did not judge it.
	Overtaken []int64             `json:"overtaken"`
	Sources   []assessment.Source `json:"governed_by"`
	Speed     int                 `json:"speed_kmh"`
	Start     int64               `json:"start_mm"` // running distance
	To        string              `json:"to_km"`
}

// TraceLevel is a piece of an older profile, on the newest track.
type TraceLevel struct {
	End   int64 `json:"end_mm"`
	Speed int   `json:"speed_kmh"` // 0: no such track
	Start int64 `json:"start_mm"`
}

// TraceBand is the profile over a run of revisions.
type TraceBand struct {
	Committed string       `json:"committed"` // of the first of them
	Gap       bool         `json:"gap"`       // they do not load
	Pieces    []TraceLevel `json:"pieces"`
}

// TraceJSON writes a trace.
func TraceJSON(w io.Writer, t *Trace) error {
	out := *t
	out.Format, out.Caution = traceJSONFormat, Caution
	return indented(w, out)
}

// TraceCSV writes a row for each train and revision at which the speed changed;
// of a stretch, for each train and piece.
func TraceCSV(w io.Writer, t *Trace) error {
	out := csv.NewWriter(w)
	commit := func(i int) []string {
		c := &t.Commits[i]
		return []string{c.Hash, harmless(source.Visible(c.Author.Name)), c.Authored, c.Committed, harmless(source.Visible(c.Subject))}
	}
	tail := func(i int) []string {
		c := &t.Commits[i]
		return []string{harmless(requestIDs(c)), harmless(source.Visible(assessmentNumbers(c)))}
	}
	if t.At != "" {
		out.Write([]string{"route", "direction", "train", "at_km", "before_kmh", "after_kmh", "commit", "author", "authored", "committed", "subject",
			"before_source", "after_source", "requests", "assessments", "remark"})
	} else {
		out.Write([]string{"route", "direction", "train", "from_km", "to_km", "length_m", "speed_kmh", "commit", "author", "authored", "committed", "subject",
			"governed_by", "requests", "assessments", "remark"})
	}
	for _, trail := range t.Trails {
		for _, train := range trail.Trains {
			for i := range trail.Steps {
				s := &trail.Steps[i]
				before, was := "", ""
				if len(s.Before) > 0 {
					before, was = csvSpeed(s.Before[0].Speed), assessment.SourceText(s.Before[0].Sources)
				}
				row := []string{harmless(t.Route), trail.Direction, harmless(train), t.At, before, csvSpeed(s.After.Speed)}
				row = append(row, commit(s.After.Commit)...)
				row = append(row, harmless(was), harmless(assessment.SourceText(s.After.Sources)))
				row = append(row, tail(s.After.Commit)...)
				out.Write(append(row, harmless(source.Visible(strings.Join(stepRemarks(t, s), "; ")))))
			}
		}
	}
	for _, stretch := range t.Stretches {
		for _, train := range stretch.Trains {
			for _, p := range stretch.Pieces {
				row := []string{harmless(t.Route), stretch.Direction, harmless(train), p.From, p.To, metres(p.End - p.Start), csvSpeed(p.Speed)}
				row = append(row, commit(p.Origin)...)
				row = append(row, harmless(assessment.SourceText(p.Sources)))
				row = append(row, tail(p.Origin)...)
				out.Write(append(row, harmless(source.Visible(strings.Join(pieceRemarks(t, &p), "; ")))))
			}
		}
	}
	out.Flush()
	return out.Error()
}

// csvSpeed writes a speed; where there is no such track, nothing.
func csvSpeed(v int) string {
	if v == 0 {
		return ""
	}
	return strconv.Itoa(v)
}

func requestIDs(c *TraceCommit) string {
	var ids []string
	for _, q := range c.Requests {
		ids = append(ids, q.ID)
	}
	return strings.Join(ids, "; ")
}

func assessmentNumbers(c *TraceCommit) string {
	var list []string
	for _, a := range c.Assessments {
		list = append(list, strconv.FormatInt(a.Number, 10)+" "+strings.Join(a.words(), ", "))
	}
	if words := c.anchorWords(); words != "" {
		list = append(list, words)
	}
	if len(list) == 0 {
		return "not assessed"
	}
	return strings.Join(list, "; ")
}

// speedWords writes a speed for a reader.
func speedWords(v int) string {
	if v == 0 {
		return "no such track"
	}
	return strconv.Itoa(v)
}

// stepRemarks says what a step does not show by itself.
func stepRemarks(t *Trace, s *TraceStep) []string {
	var list []string
	switch {
	case len(s.Before) == 0 && t.isCut(s.After.Commit):
		list = append(list, "the clone is shallow and ends here: what was before is not known")
	case len(s.Before) == 0 && s.Across > 0:
		list = append(list, "the history begins with revisions that do not load")
	case len(s.Before) == 0:
		list = append(list, "the history begins here")
	case len(s.Before) > 1:
		words := make([]string, len(s.Before))
		for i, b := range s.Before {
			words[i] = speedWords(b.Speed)
		}
		list = append(list, "a merge, it differs from all its parents: "+strings.Join(words, ", "))
	}
	if s.Across > 0 {
		list = append(list, acrossWords(s.Across))
	}
	if s.Aside {
		list = append(list, "a later merge did not take it")
	}
	list = append(list, overtakenWords(s.Overtaken, s.AnchorOvertaken)...)
	return append(list, declaredRemarks(&t.Commits[s.After.Commit], s.DeclaredBy, nil)...)
}

// overtakenWords says what the assessments and the anchor beside a speed do not speak of.
func overtakenWords(assessments []int64, anchor bool) []string {
	var words []string
	if anchor {
		words = append(words, "! whoever signed the anchor did not judge this speed: a later commit or merge up to its revision altered it")
	}
	for _, n := range assessments {
		words = append(words, fmt.Sprintf("! assessment %d did not judge this speed: a later commit or merge up to its target altered it", n))
	}
	return words
}

// declaredRemarks says which of the requests in play at a commit declare what changed,
// and which a part of it.
func declaredRemarks(c *TraceCommit, by, inPart []string) (list []string) {
	if len(by) > 0 {
		list = append(list, "declared here by "+strings.Join(by, ", "))
	}
	if len(inPart) > 0 {
		list = append(list, "declared in part by "+strings.Join(inPart, ", ")+"; run-out beyond a declaration is not looked at")
	}
	if list == nil && len(c.Requests) > 0 {
		list = []string{"no request in play declares it here; run-out beyond a declaration is not looked at"}
	}
	return list
}

func pieceRemarks(t *Trace, p *TracePiece) []string {
	var list []string
	switch {
	case len(p.Before) == 0 && t.isCut(p.Origin):
		list = append(list, "the clone is shallow and ends here: it may be older")
	case len(p.Before) == 0:
		list = append(list, "the history begins here")
	}
	if p.Across > 0 {
		list = append(list, acrossWords(p.Across))
	}
	list = append(list, overtakenWords(p.Overtaken, p.AnchorOvertaken)...)
	if len(p.Before) == 0 {
		return list
	}
	return append(list, declaredRemarks(&t.Commits[p.Origin], p.DeclaredBy, p.DeclaredInPart)...)
}

func acrossWords(n int) string {
	return "compared across " + plural(n, "revision", "revisions") + " that " + map[bool]string{true: "does", false: "do"}[n == 1] + " not load"
}

func (t *Trace) isCut(commit int) bool {
	for _, c := range t.Cut {
		if c == commit {
			return true
		}
	}
	return false
}
