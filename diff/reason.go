package diff

import (
	"path"
	"slices"

	"speedtrail/diff/profile"
	"speedtrail/diff/rows"
	"speedtrail/diff/written"
	"speedtrail/schema"
	"speedtrail/schema/codes"
)

// Reason says why no change comes of a difference.
type Reason uint8

// The reasons.
const (
	NoReason        Reason = iota // a change comes of it
	SameValue                     // the same values, written otherwise
	OnlyText                      // a note, a name or a reason
	OnlyValidity                  // the dates of a temporary restriction, and perhaps texts
	SameForAll                    // the rows say the same for every train
	NoSuchTrain                   // no reference train is of a category that it concerns
	LowerElsewhere                // another restriction is lower for every reference train that it concerns
	HiddenToday                   // temporary restrictions hide it
	NoSpeed                       // a curve, a gradient, a place
	NotTheTrack                   // reference trains, requests, policy, settings
	TrackUnaffected               // the track is the same for trains
	OtherZone                     // the time zone of dates without one
	ByDates                       // only at some time, by the dates of temporary restrictions
)

// String words the reason.
func (r Reason) String() string {
	return [...]string{
		"", "the same values, written otherwise", "only a text differs",
		"only the validity differs; all temporary restrictions count, whatever their dates",
		"the rows say the same for every train", "no reference train is of a category that it concerns",
		"another restriction is as low or lower for every reference train that it concerns",
		"hidden today by temporary restrictions on every place that it concerns", "it holds no speed",
		"it is not part of the track", "no speed depends on it",
		"only validities differ, by the hours between the zones, on every route, also on those that are the same; all temporary restrictions count, whatever their dates",
		"only by dates, see the finding dates-changed; all temporary restrictions count, whatever their dates",
	}[r]
}

// explain gives every difference of the route that no change comes of its
// reason.
func (r *Route) explain(trains []Train) {
	for _, list := range [...]struct {
		changes []Change
		mark    func(*RowDifference)
	}{
		{r.Changes, func(d *RowDifference) { d.Causes = true }},
		{r.Masked, func(d *RowDifference) { d.Masks = true }},
	} {
		seen := make([]bool, len(r.Causes))
		for i := range list.changes {
			seen[list.changes[i].Causes] = true
		}
		for i, causes := range r.Causes {
			if !seen[i] {
				continue
			}
			for _, c := range causes {
				list.mark(&r.Files[c.File].Rows[c.Row])
			}
		}
	}
	if len(r.Track) > 0 {
		for _, c := range r.causes.track {
			r.Files[c.File].Rows[c.Row].Track = true
		}
		if r.Base == nil || r.Target == nil {
			for i := range r.Files {
				for k := range r.Files[i].Rows {
					r.Files[i].Rows[k].Track = true
				}
			}
		}
	}
	for i := range r.Files {
		f := &r.Files[i]
		layer, speeds := layerOf(f.Path())
		for k := range f.Rows {
			d := &f.Rows[k]
			if speeds && !d.Causes && !d.Track && !d.Masks {
				d.Track = r.onTrack(Added, r.Target, layer, linesOf(f.Tables[d.Table].New.Rows, d.New)) ||
					r.onTrack(Removed, r.Base, layer, linesOf(f.Tables[d.Table].Old.Rows, d.Old))
			}
			if !d.Causes && !d.Track {
				d.Reason = r.reason(Cause{i, k}, trains)
			}
		}
	}
}

// onTrack tells whether one of the rows lies on track that only one side has.
func (r *Route) onTrack(fate Fate, route *schema.Route, layer profile.Layer, lines []int) bool {
	for _, line := range lines {
		row := anyRow(route, layer, line)
		if row != nil && slices.ContainsFunc(r.Track, func(t TrackChange) bool {
			return t.Fate == fate && t.From < row.End && row.Start < t.To && row.Directions.Has(t.Direction)
		}) {
			return true
		}
	}
	return false
}

func (r *Route) reason(c Cause, trains []Train) Reason {
	f := &r.Files[c.File]
	d := &f.Rows[c.Row]
	layer, speeds := layerOf(f.Path())
	within := func(known ...string) bool {
		columns := f.Columns(d)
		return (d.Kind != rows.Added && d.Kind != rows.Removed) && !slices.ContainsFunc(columns, func(c string) bool { return !slices.Contains(known, c) })
	}
	switch {
	case d.Kind == rows.Altered && f.sameValues(d):
		return SameValue
	case within(written.Texts...) && d.Kind == rows.Altered:
		return OnlyText
	case path.Base(f.Path()) == "route.toml":
		return TrackUnaffected
	case !speeds:
		return NoSpeed
	case layer == profile.Temporary && within(append(slices.Clone(written.Texts), "valid_from", "valid_to")...):
		return OnlyValidity
	case d.Masks:
		return HiddenToday
	case layer == profile.Temporary && r.datedBy(linesOf(f.Tables[d.Table].Old.Rows, d.Old), linesOf(f.Tables[d.Table].New.Rows, d.New)):
		return ByDates
	}
	return r.together(c, trains)
}

// concernsSome tells whether something holds for any direction and any class of
// trains that the standard can describe.
func concernsSome(holds func(codes.Direction, profile.Class) bool) bool {
	return concernsIn(codes.Nominal, holds) || concernsIn(codes.Reverse, holds)
}

func concernsIn(direction codes.Direction, holds func(codes.Direction, profile.Class) bool) bool {
	for cant := range codes.CantDeficiency(codes.CantDeficiencies) {
		for set := range codes.CategorySet(codes.CategorySets) {
			if holds(direction, profile.Class{Cant: cant, Categories: set}) {
				return true
			}
		}
	}
	for axle := range codes.AxleLoad(codes.AxleLoads) {
		if holds(direction, profile.Class{AxleLoad: axle}) {
			return true
		}
	}
	return false
}

// sameValues tells whether all cells of a difference mean what they meant.
func (f *File) sameValues(d *RowDifference) bool {
	t := &f.Tables[d.Table]
	for _, c := range d.Cells {
		if !written.SameValue(t.New.Columns[c.Column], t.Old.Rows[c.Old].Cells[c.Column], t.New.Rows[c.New].Cells[c.Column]) {
			return false
		}
	}
	return true
}

// explainFrame gives the differences outside the routes their reason.
func explainFrame(files []File) {
	for i := range files {
		f := &files[i]
		for k := range f.Rows {
			d := &f.Rows[k]
			d.Reason = NotTheTrack
			if f.Path() == "dataset.toml" && slices.Contains(f.Columns(d), "time_zone") {
				d.Reason = OtherZone
			}
			if d.Kind == rows.Altered && f.sameValues(d) {
				d.Reason = SameValue
			}
		}
	}
}
