package render

import (
	"fmt"
	"slices"
	"strings"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

// pageTable is a table of changes of one direction of a route without a chart: of
// those that temporary restrictions hide today, or of others that are not drawn.
type pageTable struct {
	Route, RouteName, Direction string
	TrainIDs                    string // joined by a line feed, for the filter
	Rows                        []pageRow
	IDs                         []string // of the rows
}

// fillHidden lists the changes that appear when temporary restrictions end.
func (p *page) fillHidden() {
	shown := 0
	for i := range p.C.Routes {
		r := &p.C.Routes[i]
		for list := r.Masked; len(list) > 0; {
			n := 1
			for n < len(list) && list[n].Direction == list[0].Direction {
				n++
			}
			room := min(n, mostHTMLRows-shown)
			p.HiddenLeft += n - room
			if room > 0 {
				hidden := make([]*assessment.Change, room)
				for k := range hidden {
					hidden[k] = &list[k]
				}
				p.Hidden = append(p.Hidden, p.table(r, hidden, "h", shown))
				shown += room
			}
			list = list[n:]
		}
	}
}

// table arranges the changes of one direction; n is how many changes the page has so
// far in tables of the kind, h for hidden.
func (p *page) table(r *assessment.Route, list []*assessment.Change, kind string, n int) pageTable {
	out := pageTable{Route: r.ID, RouteName: r.Name, Direction: list[0].Direction}
	anchor := func(i int) string { return fmt.Sprintf("%s%d", kind, n+i+1) }
	var trains []int
	for _, x := range list {
		var at int
		out.Rows, at = p.appendRow(out.Rows, r, x, x.Trains)
		p.anchors.add(r, x, anchor(at), kind == "h")
		trains = append(trains, x.Trains...)
	}
	for k := range out.Rows {
		out.IDs = append(out.IDs, anchor(k))
	}
	slices.Sort(trains)
	out.TrainIDs = filterIDs(p.C, slices.Compact(trains))
	return out
}

// fillTrack lists the track that only one revision has.
func (p *page) fillTrack() {
	for i := range p.C.Routes {
		r := &p.C.Routes[i]
		for _, t := range r.Track {
			id := fmt.Sprintf("t%d", len(p.Track)+1)
			p.anchors.addTrack(r, t, id)
			p.Track = append(p.Track, pageTrack{id, r.ID, r.Name, t.Direction, minus(t.From), minus(t.To), metres(t.Length), t.Fate, p.profileCommand(r.ID, t)})
		}
	}
}

// profileCommand writes the command that shows the speeds on track that only one
// revision has: a comparison has none.
func (p *page) profileCommand(route string, t assessment.TrackPiece) string {
	side, id := &p.C.Target, ""
	if t.Fate == "removed" {
		side = &p.C.Base
	}
	for _, train := range p.C.Trains {
		if t.Fate == "removed" && train.Before == nil || t.Fate != "removed" && train.After == nil {
			continue
		}
		id = train.ID
		break
	}
	return profileCommand(p.C, side, route, t.Direction, id)
}

// profileCommand writes the command that shows the profile of a train.
func profileCommand(c *assessment.Computed, side *assessment.Revision, route, direction, train string) string {
	words := []string{"speedtrail", "profile"}
	if side.Commit != "" {
		words = append(words, short(side.Commit))
	}
	if c.Folder != "." {
		words = append(words, "--data="+c.Folder)
	}
	words = append(words, "--route="+route, "--direction="+direction)
	if train != "" {
		words = append(words, "--train="+train)
	}
	for i, w := range words {
		words[i] = shellWord(w)
	}
	return source.Visible(strings.Join(words, " "))
}

// shellWord quotes a word for a shell where it needs that.
func shellWord(s string) string {
	plain := func(r rune) bool {
		return r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || strings.ContainsRune("-_=./,:+@", r)
	}
	if s != "" && strings.IndexFunc(s, func(r rune) bool { return !plain(r) }) < 0 {
		return s
	}
	return "'" + strings.ReplaceAll(s, "'", `'\''`) + "'"
}
