package assessment

import (
	"crypto/sha256"
	"encoding/hex"
	"slices"
	"strconv"
	"strings"
	"time"

	"speedtrail/diff"
	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/parallel"
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
	// PreparedSince is the commit from which preparers are counted; empty: the base.
	PreparedSince string
	Options       Options
	// At is what validities are compared with: the target's committer date, for
	// the working tree the present.
	At time.Time
	// BaseIsAncestor tells whether the target's history holds the base.
	BaseIsAncestor bool
	// TargetIsAncestor tells, where it does not, whether the base's history holds the
	// target.
	TargetIsAncestor bool
}

// Build makes the document. The same input gives the same document.
func Build(in Input) *Document {
	c := Computed{
		At:            in.At.UTC().Format(time.RFC3339),
		Base:          in.BaseRev,
		Dataset:       in.Target.Name,
		EqualRoutes:   in.Account.Equal,
		Files:         files(in.Base.Files, in.Target.Files),
		Folder:        in.Folder,
		Limits:        limits(in.Base.Limits, in.Target.Limits),
		Options:       in.Options,
		Policy:        Policies{Base: policy(in.Base), Target: policy(in.Target)},
		Preparers:     in.Preparers,
		PreparedSince: in.PreparedSince,
		Requests:      requests(in.Account),
		Routes:        make([]Route, len(in.Account.Routes)),
		RulesVersion:  diff.RulesVersion,
		Target:        in.TargetRev,
		Trains:        trains(in.Account),
	}
	var places [][]int
	c.Source, places = sourceFiles(in.Account)
	groups := make([][]int, len(in.Account.Routes))
	parallel.Each(len(groups), func(i int) { c.Routes[i], groups[i] = route(&in.Account.Routes[i], places[i]) })
	c.Stretches = stretches(in.Account, groups)
	c.Fleet = fleets(in.Account)
	c.Figures = figures(in.Account)
	c.Findings, c.Accepted = findings(&in, &c)
	c.Explained = explanations(c.Findings)
	return &Document{Computed: c, Format: Format, Named: in.Named}
}

func policy(d *schema.Dataset) Policy {
	signoff, signers := d.PolicyFiles()
	return Policy{SignOff: string(signoff), AllowedSigners: string(signers)}
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
// account, the index of the document's change that it became part of. places are
// the indices in Computed.Source of the route's files.
func route(r *diff.Route, places []int) (doc Route, groups []int) {
	doc = Route{ID: r.ID, Fate: "kept", Changes: []Change{}, Masked: []Change{}, Sources: [][]Source{}, Track: []TrackPiece{}, Causes: [][]Cause{}}
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
	for _, list := range r.Sources {
		doc.Sources = append(doc.Sources, Sources(list))
	}
	for _, list := range r.Causes {
		causes := []Cause{}
		for _, c := range list {
			causes = append(causes, Cause{File: places[c.File], Row: c.Row})
		}
		doc.Causes = append(doc.Causes, causes)
	}
	doc.Pieces = pieces(r)
	for _, t := range r.Track {
		track := r.Target
		if t.Fate == diff.Removed {
			track = r.Base
		}
		doc.Track = append(doc.Track, TrackPiece{
			Direction: t.Direction.String(), Fate: t.Fate.String(), Length: int64(t.To - t.From), Pieces: t.Pieces,
			From: track.Track.Begins(t.From).String(), To: track.Track.Ends(t.To).String(),
		})
	}
	doc.Changes, groups = changes(r, r.Changes)
	doc.Masked, _ = changes(r, r.Masked)
	return doc, groups
}

// changes joins the changes that differ only in the train. Those begin at one
// place and so stand together.
func changes(r *diff.Route, list []diff.Change) (out []Change, groups []int) {
	groups = make([]int, len(list))
	var first, trains []int // of each group, a change and the number of trains
	seen := map[diff.Change]int{}
	for i, c := range list {
		if i > 0 && (c.Direction != list[i-1].Direction || c.From != list[i-1].From) {
			clear(seen)
		}
		c.Train = 0
		at, ok := seen[c]
		if !ok {
			at = len(first)
			seen[c] = at
			first, trains = append(first, i), append(trains, 0)
		}
		groups[i] = at
		trains[at]++
	}
	out = make([]Change, len(first))
	all := make([]int, 0, len(list))
	for at, i := range first {
		c := &list[i]
		out[at] = Change{
			Direction: c.Direction.String(), Start: int64(c.From), Length: int64(c.Length()), RunOut: c.RunOut,
			From: r.Target.Track.Begins(c.From).String(), To: r.Target.Track.Ends(c.To).String(),
			Before: int(c.Before), After: int(c.After), BeforeSource: c.BeforeSources, AfterSource: c.AfterSources,
			Cause: c.Causes, Pieces: c.Pieces, Trains: all[len(all) : len(all) : len(all)+trains[at]],
		}
		all = all[:len(all)+trains[at]]
	}
	for i, at := range groups {
		out[at].Trains = append(out[at].Trains, list[i].Train)
	}
	return out, groups
}

// pieces writes how declarations hold the changes of a route. Pieces of removed
// track stand on the base's track.
func pieces(r *diff.Route) [][]Piece {
	removed := map[int]bool{}
	for _, t := range r.Track {
		if t.Fate == diff.Removed && t.Pieces != 0 {
			removed[t.Pieces] = true
		}
	}
	out := make([][]Piece, len(r.Pieces))
	for i, list := range r.Pieces {
		side := r.Target
		if side == nil || removed[i] {
			side = r.Base
		}
		out[i] = []Piece{}
		for _, p := range list {
			out[i] = append(out[i], Piece{
				By: p.By, RunOut: p.RunOut, Start: int64(p.From), Length: int64(p.To - p.From),
				From: side.Track.Begins(p.From).String(), To: side.Track.Ends(p.To).String(),
			})
		}
	}
	return out
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
		list[i] = Train{ID: t.ID, Fate: t.Fate.String(), Declared: t.Declared, Routes: []string{}}
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
