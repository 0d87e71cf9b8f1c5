package assessment

import (
	"cmp"
	"fmt"
	"slices"
	"strings"

	"speedtrail/diff"
	"speedtrail/diff/profile"
	"speedtrail/diff/scope"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// part is a piece of a change.
type part struct {
	from, to unit.Distance
	change   *diff.Change
	hidden   bool
}

// stretchOf is a run of pieces of changes that touch.
type stretchOf struct {
	direction codes.Direction
	from, to  unit.Distance
	raised    bool
	trains    []int
	seen      map[int]unit.Distance // how far each train sees changes without a gap, from the beginning
	changes   []*diff.Change
	allRunOut bool
	allHidden bool
	structure bool
}

// gather joins parts of changes of one sense that touch.
func (c *collector) gather(r *diff.Route, parts []part) []stretchOf {
	slices.SortStableFunc(parts, func(a, b part) int {
		return cmp.Or(cmp.Compare(a.change.Direction, b.change.Direction), before(a.change.Raised(), b.change.Raised()), cmp.Compare(a.from, b.from), cmp.Compare(a.to, b.to))
	})
	var list []stretchOf
	for _, p := range parts {
		n := len(list) - 1
		if n < 0 || list[n].direction != p.change.Direction || list[n].raised != p.change.Raised() || p.from > list[n].to {
			list = append(list, stretchOf{direction: p.change.Direction, from: p.from, to: p.to, raised: p.change.Raised(), allRunOut: true, allHidden: true, seen: map[int]unit.Distance{}})
			n++
		}
		s := &list[n]
		s.to = max(s.to, p.to)
		t := p.change.Train
		if _, ok := s.seen[t]; !ok {
			s.trains, s.seen[t] = append(s.trains, t), s.from
		}
		if p.from <= s.seen[t] {
			s.seen[t] = max(s.seen[t], p.to)
		}
		s.changes = append(s.changes, p.change)
		s.allRunOut = s.allRunOut && p.change.RunOut
		s.allHidden = s.allHidden && p.hidden
		for _, sources := range [...]int{p.change.BeforeSources, p.change.AfterSources} {
			s.structure = s.structure || slices.ContainsFunc(r.Sources[sources], func(x profile.Source) bool { return x.Layer == profile.AxleLoad })
		}
	}
	slices.SortStableFunc(list, func(a, b stretchOf) int {
		return cmp.Or(cmp.Compare(a.direction, b.direction), cmp.Compare(a.from, b.from))
	})
	return list
}

// finding words a stretch.
func (c *collector) finding(id string, r *diff.Route, s stretchOf, tail string) ranked {
	slices.Sort(s.trains)
	var largest *diff.Change
	for _, x := range s.changes {
		if largest == nil || abs(x.After-x.Before) > abs(largest.After-largest.Before) {
			largest = x
		}
	}
	word := "raised"
	if !s.raised {
		word = "lowered"
	}
	text := fmt.Sprintf("%s by up to %d km/h, %d to %d (%s)", word, abs(largest.After-largest.Before), largest.Before, largest.After, c.trainsOf(s, largest))
	if s.allRunOut {
		text += ", run-out of the train length"
	}
	return ranked{
		Finding: Finding{
			ID: id, Route: r.ID, Direction: s.direction.String(), From: r.Target.Track.Begins(s.from).String(), To: r.Target.Track.Ends(s.to).String(),
			Row: c.rowsOf(r, s.changes), Text: text + tail,
		},
		raised: s.raised, structure: s.structure, runOut: s.allRunOut, step: int(abs(largest.After - largest.Before)),
	}
}

// trainsOf names the trains of a stretch: those that see its largest change, those
// that see other speeds, and whether each of them sees a change everywhere on it.
func (c *collector) trainsOf(s stretchOf, largest *diff.Change) string {
	sees := map[int]bool{}
	for _, x := range s.changes {
		if x.Before == largest.Before && x.After == largest.After {
			sees[x.Train] = true
		}
	}
	var names, others []string
	throughout := true
	for _, t := range s.trains {
		if id := c.in.Account.Trains[t].ID; sees[t] {
			names = append(names, id)
		} else {
			others = append(others, id)
		}
		throughout = throughout && s.seen[t] == s.to
	}
	text := strings.Join(names, ", ")
	if len(others) > 0 {
		text += "; other speeds for " + strings.Join(others, ", ")
	}
	if !throughout {
		text += "; not each of them throughout"
	}
	return text
}

func abs(v unit.Speed) unit.Speed { return max(v, -v) }

// mostRows bounds the rows that a finding names.
const mostRows = 3

// rowsOf names the rows behind changes: of the target, or of the base where a
// row was removed.
func (c *collector) rowsOf(r *diff.Route, changes []*diff.Change) string {
	var lists [][]diff.Cause
	looked := map[int]bool{}
	for _, x := range changes {
		if !looked[x.Causes] {
			looked[x.Causes] = true
			lists = append(lists, r.Causes[x.Causes])
		}
	}
	return causesText(r, lists)
}

// causesText names the rows of lists of causes.
func causesText(r *diff.Route, lists [][]diff.Cause) string {
	var names []string
	listed := map[string]bool{}
	for _, list := range lists {
		for _, cause := range list {
			f := &r.Files[cause.File]
			d := &f.Rows[cause.Row]
			name := ""
			if t := &f.Tables[d.Table]; len(d.New) > 0 {
				name = fmt.Sprintf("%s:%d", f.Target, t.New.Rows[telling(f, d)].Line)
			} else {
				name = fmt.Sprintf("%s:%d of the base", f.Base, t.Old.Rows[d.Old[0]].Line)
			}
			if !listed[name] {
				listed[name] = true
				names = append(names, name)
			}
		}
	}
	if more := len(names) - mostRows; more > 0 {
		return strings.Join(names[:mostRows], ", ") + fmt.Sprintf(" and %d more", more)
	}
	return strings.Join(names, ", ")
}

// outside finds the parts of changes that no declaration holds.
func (c *collector) outside(index int) {
	r := &c.in.Account.Routes[index]
	var parts []part
	for k, list := range [...][]diff.Change{r.Changes, r.Masked} {
		for i := range list {
			x := &list[i]
			pieces := r.Pieces[x.Pieces]
			if len(pieces) == 0 {
				parts = append(parts, part{x.From, x.To, x, k == 1})
			}
			for _, p := range pieces {
				if p.By == scope.Outside {
					parts = append(parts, part{p.From, p.To, x, k == 1})
				}
			}
		}
	}
	tail := ": no declaration of a request in play holds it"
	if len(c.in.Account.Requests) == 0 {
		tail = ": no change request is in play"
	}
	for _, s := range c.gather(r, parts) {
		end := tail
		if s.allHidden {
			end = ", hidden today by temporary restrictions" + tail
		}
		c.add(c.finding(Outside, r, s, end))
	}
}

// outsideTrack finds added and removed track that no declaration holds.
func (c *collector) outsideTrack(index int) {
	r := &c.in.Account.Routes[index]
	for _, t := range r.Track {
		track := r.Target
		if t.Fate == diff.Removed {
			track = r.Base
		}
		pieces := r.Pieces[t.Pieces]
		if len(pieces) == 0 {
			pieces = []scope.Piece{{From: t.From, To: t.To, By: scope.Outside}}
		}
		for _, p := range pieces {
			if p.By != scope.Outside {
				continue
			}
			f := ranked{Finding: Finding{
				ID: Outside, Route: r.ID, Direction: t.Direction.String(), From: track.Track.Begins(p.From).String(), To: track.Track.Ends(p.To).String(),
				Text: fmt.Sprintf("%s m of track %s: no declaration with effect \"any\" of a request in play holds it", (p.To - p.From).M(), t.Fate),
			}}
			if track.Pos.File != "" {
				f.Row = fmt.Sprintf("%s/route.toml", track.Folder)
			}
			c.add(f)
		}
	}
}

// masked finds changes that temporary restrictions hide.
func (c *collector) masked(index int) {
	r := &c.in.Account.Routes[index]
	var parts []part
	for i := range r.Masked {
		parts = append(parts, part{r.Masked[i].From, r.Masked[i].To, &r.Masked[i], true})
	}
	for _, s := range c.gather(r, parts) {
		c.add(c.finding(Masked, r, s, ", not seen today"))
	}
}

// telling gives the new row that a difference is known by: of a split row, the
// first part in which a cell differs that is not a limit.
func telling(f *diff.File, d *diff.RowDifference) int {
	for _, c := range d.Cells {
		switch f.Tables[d.Table].New.Columns[c.Column] {
		case "from_km", "to_km", "km", "note":
		default:
			return c.New
		}
	}
	return d.New[0]
}
