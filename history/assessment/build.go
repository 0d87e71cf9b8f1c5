package assessment

import (
	"crypto/sha256"
	"encoding/hex"
	"slices"
	"strconv"
	"strings"

	"speedtrail/diff"
	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Input is what a document is made from.
type Input struct {
	Base, Target *schema.Dataset
	Account      *diff.Account
	BaseRev      Revision
	TargetRev    Revision
	Named        Named
	Folder       string // "." for the repository's root
	Preparers    []Person
	Options      Options
	Findings     []Finding
}

// Build makes the document. The same input gives the same document.
func Build(in Input) *Document {
	c := Computed{
		Base:         in.BaseRev,
		Dataset:      in.Target.Name,
		EqualRoutes:  in.Account.Equal,
		Files:        files(in.Base.Files, in.Target.Files),
		Findings:     in.Findings,
		Folder:       in.Folder,
		Options:      in.Options,
		Preparers:    in.Preparers,
		Requests:     []Request{},
		Routes:       make([]Route, 0, len(in.Account.Routes)),
		RulesVersion: diff.RulesVersion,
		Source:       sourceFiles(in.Account, in.Base.Files, in.Target.Files),
		Target:       in.TargetRev,
		Trains:       trains(in.Account),
	}
	for _, q := range in.Account.Requests {
		c.Requests = append(c.Requests, request(q))
	}
	groups := make([][]int, len(in.Account.Routes))
	for i := range in.Account.Routes {
		var r Route
		r, groups[i] = route(&in.Account.Routes[i])
		c.Routes = append(c.Routes, r)
	}
	c.Stretches = stretches(in.Account, groups)
	return &Document{Computed: c, Format: Format, Named: in.Named}
}

// files lists the files of both sides with their hashes.
func files(base, target []schema.File) []File {
	byPath := map[string]*File{}
	var list []*File
	get := func(path string) *File {
		f := byPath[path]
		if f == nil {
			f = &File{Path: path}
			byPath[path] = f
			list = append(list, f)
		}
		return f
	}
	for _, f := range base {
		get(f.Path).Base = hash(f.Content)
	}
	for _, f := range target {
		get(f.Path).Target = hash(f.Content)
	}
	slices.SortFunc(list, func(a, b *File) int { return strings.Compare(a.Path, b.Path) })
	out := make([]File, len(list))
	for i, f := range list {
		out[i] = *f
	}
	return out
}

func hash(content []byte) string {
	sum := sha256.Sum256(content)
	return hex.EncodeToString(sum[:])
}

// route writes what differs on a route; groups gives, for each change of the
// account, the index of the document's change that it became part of.
func route(r *diff.Route) (doc Route, groups []int) {
	doc = Route{ID: r.ID, Fate: "kept", Changes: []Change{}, Sources: [][]Source{}, Track: []TrackPiece{}}
	switch {
	case r.Base == nil:
		doc.Fate, doc.Name, doc.Folder = "added", r.Target.Name, r.Target.Folder
	case r.Target == nil:
		doc.Fate, doc.Name, doc.Folder = "removed", r.Base.Name, r.Base.Folder
	default:
		doc.Name, doc.Folder = r.Target.Name, r.Target.Folder
		if r.Base.Name != doc.Name {
			doc.NameBefore = r.Base.Name
		}
		if r.Base.Folder != doc.Folder {
			doc.FolderBefore = r.Base.Folder
		}
	}
	shown := r.Target
	if shown == nil {
		shown = r.Base
	}
	doc.Start, doc.End = shown.Track.Begins(0).String(), shown.Track.Ends(shown.Track.Length()).String()
	for _, t := range r.Track {
		track := r.Target
		if t.Fate == diff.Removed {
			track = r.Base
		}
		doc.Track = append(doc.Track, TrackPiece{
			Direction: t.Direction.String(), Fate: t.Fate.String(), Length: int64(t.To - t.From),
			From: track.Track.Begins(t.From).String(), To: track.Track.Ends(t.To).String(),
		})
	}
	for _, list := range r.Sources {
		doc.Sources = append(doc.Sources, Sources(list))
	}
	groups = make([]int, len(r.Changes))
	seen := map[diff.Change]int{}
	for i, c := range r.Changes {
		key := c
		key.Train = 0
		at, ok := seen[key]
		if !ok {
			at = len(doc.Changes)
			seen[key] = at
			doc.Changes = append(doc.Changes, Change{
				Direction: c.Direction.String(), Start: int64(c.From), Length: int64(c.Length()), RunOut: c.RunOut,
				From: r.Target.Track.Begins(c.From).String(), To: r.Target.Track.Ends(c.To).String(),
				Before: int(c.Before), After: int(c.After), BeforeSource: c.BeforeSources, AfterSource: c.AfterSources,
			})
		}
		doc.Changes[at].Trains = append(doc.Changes[at].Trains, c.Train)
		groups[i] = at
	}
	return doc, groups
}

// Sources writes governing rows.
func Sources(list []profile.Source) []Source {
	out := make([]Source, len(list))
	for i, s := range list {
		out[i] = Source{File: s.Pos.File, Line: s.Pos.Line, Kind: s.Kind, Value: int(s.Value)}
	}
	return out
}

// trains writes the reference trains with their totals over all routes.
func trains(a *diff.Account) []Train {
	list := make([]Train, len(a.Trains))
	for i, t := range a.Trains {
		list[i] = Train{ID: t.ID, Fate: t.Fate.String(), Routes: []string{}}
		now := definition(t.Train)
		switch t.Fate {
		case diff.Added:
			list[i].After = now
		case diff.Removed:
			list[i].Before = now
		case diff.Altered:
			list[i].Before, list[i].After = definition(t.Before), now
		default:
			list[i].Before, list[i].After = now, now
		}
	}
	for _, r := range a.Routes {
		for _, c := range r.Changes {
			t := &list[c.Train]
			if c.Raised() {
				t.Raised += int64(c.Length())
				t.LargestRaise = max(t.LargestRaise, int(c.After-c.Before))
			} else {
				t.Lowered += int64(c.Length())
				t.LargestReduction = max(t.LargestReduction, int(c.Before-c.After))
			}
			if n := len(t.Routes); n == 0 || t.Routes[n-1] != r.ID {
				t.Routes = append(t.Routes, r.ID)
			}
		}
	}
	return list
}

func definition(t schema.Train) *Definition {
	d := &Definition{
		AxleLoad: t.AxleLoad.String(), CantDeficiency: t.Cant.MM(), Categories: []string{}, Length: int64(t.Length),
		MaxSpeed: int(t.Max), Name: t.Name, Acceleration: thousandths(t.Acceleration), Braking: thousandths(t.Braking),
	}
	for c := range codes.Category(codes.Categories) {
		if t.Categories.Has(c) {
			d.Categories = append(d.Categories, c.String())
		}
	}
	return d
}

// thousandths writes n/1000 with the decimals that it has, nothing for 0.
func thousandths(n int) string {
	if n == 0 {
		return ""
	}
	return unit.Distance(n).M()
}

func request(q schema.ChangeRequest) Request {
	out := Request{ID: q.ID, Title: q.Title, Reason: q.Reason, File: q.Pos.File, Declares: []Declaration{}}
	for _, d := range q.Declare {
		trains := slices.Clone(d.Trains)
		if trains == nil {
			trains = []string{}
		}
		out.Declares = append(out.Declares, Declaration{
			Line: d.Pos.Line, Route: d.Route, Direction: d.Span.Directions.String(), Effect: d.Effect.String(),
			From: d.Span.From.String(), To: d.Span.To.String(), Trains: trains,
		})
	}
	return out
}

// Text writes a source as "path:line kind value".
func (s Source) Text() string {
	return s.File + ":" + strconv.Itoa(s.Line) + " " + s.Kind + " " + strconv.Itoa(s.Value)
}

// SourceText joins governing rows in the form that they have in CSV.
func SourceText(list []Source) string {
	texts := make([]string, len(list))
	for i, s := range list {
		texts[i] = s.Text()
	}
	return strings.Join(texts, "; ")
}
