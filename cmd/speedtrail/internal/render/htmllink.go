package render

import (
	"fmt"

	"speedtrail/history/assessment"
	"speedtrail/schema/chainage"
	"speedtrail/schema/source"
)

// pageLink is a text that may point to a part of the page. Parts are numbered:
// no id is made of a text of the data.
type pageLink struct{ Text, ID string }

// anchors are the parts of a page that others point to.
type anchors struct {
	changes map[string][]changeAnchor // by route
	// The source rows that are listed, by side and file:line.
	base, target map[string]string
	rows         int
}

// changeAnchor is a change, or track that only one revision has, that stands in a
// table of the page.
type changeAnchor struct {
	direction, from, to, id string
	hidden                  bool // by temporary restrictions
}

func (a *anchors) add(r *assessment.Route, x *assessment.Change, id string, hidden bool) {
	a.put(r.ID, changeAnchor{x.Direction, x.From, x.To, id, hidden})
}

// addTrack adds track that only one revision has.
func (a *anchors) addTrack(r *assessment.Route, t assessment.TrackPiece, id string) {
	a.put(r.ID, changeAnchor{t.Direction, t.From, t.To, id, false})
}

func (a *anchors) put(route string, x changeAnchor) {
	if a.changes == nil {
		a.changes = map[string][]changeAnchor{}
	}
	a.changes[route] = append(a.changes[route], x)
}

// addRow numbers a source row that is listed.
func (a *anchors) addRow(f *assessment.SourceFile, d *assessment.RowDiff) string {
	if a.base == nil {
		a.base, a.target = map[string]string{}, map[string]string{}
	}
	a.rows++
	id := fmt.Sprintf("r%d", a.rows)
	for _, n := range d.BaseLines {
		a.base[rowPlace(f.Base, n)] = id
	}
	for _, n := range d.TargetLines {
		a.target[rowPlace(f.Target, n)] = id
	}
	return id
}

func rowPlace(file string, line int) string { return fmt.Sprintf("%s:%d", file, line) }

// declarationAnchor names the row of a declaration, as pieces count them.
func declarationAnchor(i int) string { return fmt.Sprintf("d%d", i+1) }

// of finds the table or chart that has what a finding is about: the change of the
// same limits, else the one that shares most with it; empty where there is none. A
// change that is seen today comes before one that is hidden.
func (a *anchors) of(f assessment.Finding) string {
	from, to, ok := limits(f.From, f.To)
	if !ok {
		return ""
	}
	best, most := "", int64(-1)
	for _, x := range a.changes[f.Route] {
		if f.ID == assessment.Masked && !x.hidden || f.Direction != x.direction && f.Direction != "both" && f.Direction != "" {
			continue
		}
		first, last, ok := limits(x.from, x.to)
		if !ok || first.Occurrence != from.Occurrence && last.Occurrence != to.Occurrence {
			continue
		}
		weight := 2 * int64(min(last.Chainage, to.Chainage)-max(first.Chainage, from.Chainage))
		if !x.hidden {
			weight++
		}
		if x.from == f.From && x.to == f.To {
			weight += 1 << 60
		}
		if weight > most {
			best, most = x.id, weight
		}
	}
	return best
}

// limits reads two positions, the lesser first.
func limits(a, b string) (first, last chainage.Point, ok bool) {
	first, err := chainage.ParsePoint(a)
	if err != nil {
		return first, last, false
	}
	if last, err = chainage.ParsePoint(b); err != nil {
		return first, last, false
	}
	if first.Chainage > last.Chainage {
		first, last = last, first
	}
	return first, last, true
}

// declaredLinks says which requests hold a change, and points to what they declare.
func (p *page) declaredLinks(r *assessment.Route, pieces int) []pageLink {
	var list []pageLink
	for _, part := range declaredParts(p.C, r, pieces) {
		link := pageLink{Text: source.Visible(part.text)}
		if part.by >= 0 {
			link.ID = declarationAnchor(part.by)
		}
		list = append(list, link)
	}
	return list
}

// becauseLinks names the rows behind a change, and points to those that differ.
func (p *page) becauseLinks(before, after []assessment.Source) []pageLink {
	lines := because(before, after)
	list := make([]pageLink, len(lines))
	for i, line := range lines {
		list[i].Text = source.Visible(line)
	}
	old := func(s assessment.Source) string { return p.anchors.base[rowPlace(s.File, s.Line)] }
	now := func(s assessment.Source) string { return p.anchors.target[rowPlace(s.File, s.Line)] }
	switch {
	case len(lines) == len(before)+len(after):
		for i, s := range before {
			list[i].ID = old(s)
		}
		for i, s := range after {
			list[len(before)+i].ID = now(s)
		}
	case len(lines) == 1 && len(after) > 0 && len(before) > 0:
		if list[0].ID = now(after[0]); list[0].ID == "" {
			list[0].ID = old(before[0])
		}
	}
	return list
}

// fillContents lists the sections that the page has.
func (p *page) fillContents() {
	for _, x := range []struct {
		text, id string
		shown    bool
	}{
		{"What needs eyes first", "findings", true},
		{"Trains", "trains", true},
		{"Reference trains that differ", "altered", len(p.Altered) > 0},
		{"Track that only one revision has", "track", len(p.Track) > 0},
		{"Routes that change", "routes", len(p.RouteLines) > 0},
		{"Changed stretches", "changes", true},
		{"Hidden today", "hidden", len(p.Hidden) > 0},
		{"Declared against observed", "declared", true},
		{"Whole fleet", "fleet", len(p.Fleet) > 0},
		{"Figures", "figures", len(p.Runs)+len(p.Crossings)+len(p.Curves)+len(p.Short) > 0},
		{"Source rows", "rows", true},
		{"How it was computed", "computed", true},
		{"Sign-off", "signoff", p.R.Number != 0},
		{"Caution", "caution", true},
	} {
		if x.shown {
			p.Contents = append(p.Contents, pageLink{x.text, x.id})
		}
	}
}
