package render

import (
	"speedtrail/history/assessment"
)

// declared sets what the requests declare against what was observed.
func (m *markdown) declared() {
	c := m.c
	m.add("\n## Declared against observed\n\n%s\n", md(reconciliation(c)))
	if len(c.Requests) > 0 {
		var rows [][]string
		for _, q := range c.Requests {
			for _, d := range q.Declares {
				seen := seenWords(d)
				if c.Options.NoRequests {
					seen = "not looked at"
				}
				rows = append(rows, []string{md(q.ID), md(d.Route), d.Direction, minus(d.From), minus(d.To), d.Effect, md(declaredTrains(d)), md(seen)})
			}
		}
		m.table([]string{"request", "route", "direction", ">from, km", ">to, km", "effect", "trains", "seen, over both directions"}, rows)
	}
}

func (m *markdown) fleet() {
	c := m.c
	if len(c.Fleet) > 0 {
		m.add("\n## Whole fleet\n")
	}
	lines := 0
	for i := range c.Fleet {
		f := &c.Fleet[i]
		if lines += len(f.Changes) + 1; lines > mostHTMLRows {
			m.add("\n%d more accounts, one a route and direction, stand in the JSON form.\n", len(c.Fleet)-i)
			break
		}
		m.add("\n### %s\n\n**%s**\n\n", md(fleetTitle(f)), md(fleetStatement(f)))
		for _, l := range fleetLines(f) {
			mark := ""
			if !l.Represented {
				mark = " **(no reference train)**"
			}
			m.add("- %s: %s, %s%s\n", md(l.Who), md(l.Step), md(l.Where), mark)
		}
	}
}

func (m *markdown) figures() {
	c := m.c
	f := &c.Figures
	if len(f.Crossings)+len(f.Curves)+len(f.Short)+len(f.Runs) > 0 {
		m.add("\n## Figures\n")
	}
	list := func(title, words string, lines []string, more int, what string) {
		if len(lines) > 0 {
			m.add("\n### %s\n\n", title)
		}
		if len(lines) > 0 && words != "" {
			m.add("%s\n\n", md(words))
		}
		for _, line := range lines {
			m.add("- %s\n", md(line))
		}
		if more > 0 {
			m.add("- %d more %s stand in the JSON form\n", more, what)
		}
	}
	var crossings, curves, short []string
	for _, x := range f.Crossings {
		crossings = append(crossings, x.Route+" "+x.Direction+", km "+minus(x.Km)+" "+x.Name+": "+crossingLine(x))
	}
	shownCurves, moreCurves := bounded(curvesOfInterest(f.Curves))
	for _, x := range shownCurves {
		curves = append(curves, x.Route+" "+directionWords(x.Direction)+", km "+minus(x.From)+" to "+minus(x.To)+" ("+trainNames(c, x.Trains, 0)+"): "+curveLine(x))
	}
	shownShort, moreShort := bounded(f.Short)
	for _, x := range shownShort {
		short = append(short, x.Route+" "+x.Direction+", km "+minus(x.From)+" to "+minus(x.To)+", "+x.Train+": "+shortLine(x))
	}
	list("Level crossings", crossingWords, crossings, 0, "")
	list("Curves", curveWords, curves, moreCurves, "curves")
	list("Raises too short to be used", "", short, moreShort, "raises")
	if len(f.Runs) > 0 {
		m.add("\n### Running times\n\n%s\n", md(motionWords(c)))
		runs, more := bounded(f.Runs)
		var rows [][]string
		for _, r := range runs {
			rows = append(rows, []string{md(r.Route), r.Direction, md(r.Train), clock(r.Before), clock(r.After), seconds(r.After - r.Before)})
		}
		m.table([]string{"route", "direction", "train", ">before, min:s", ">after, min:s", ">difference, s"}, rows)
		if more > 0 {
			m.add("\n%d more running times stand in the JSON form.\n", more)
		}
	}
}

// sources lists the rows that differ.
func (m *markdown) sources() {
	c := m.c
	m.add("\n## Source rows\n\n")
	results := consequences(c)
	lines := 0
	for i := range c.Source {
		s := &c.Source[i]
		if lines += len(s.Rows) + 1; lines > mostHTMLRows {
			m.add("- %d more files; the JSON form has them all\n", len(c.Source)-i)
			break
		}
		if len(s.Rows) == 0 {
			m.add("- %s: %s\n", md(fileName(*s)), md(s.Note))
		}
		for k := range s.Rows {
			d := &s.Rows[k]
			m.add("- %s:%s %s: %s\n", md(fileName(*s)), rowLines(d), md(rowWords(s, d)), md(effectWords(c, d, results[assessment.Cause{File: i, Row: k}])))
		}
	}
}

// signOffs lists the decisions.
func (m *markdown) signOffs(r Record) {
	if r.Number == 0 {
		return
	}
	m.add("\n## Sign-off\n\n%s\n", md(stateWords(r)))
	for _, s := range r.SignOffs {
		m.add("\n- %s; %s\n", md(signedWords(r, s)), md(s.keyWords()))
	}
}
