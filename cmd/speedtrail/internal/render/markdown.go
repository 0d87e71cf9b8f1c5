package render

import (
	"bytes"
	"fmt"
	"io"
	"strings"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

// md escapes what Markdown or HTML in it could take for more than text, and what some
// readers of Markdown take for formulas, in which blanks and digits stand otherwise.
// Brackets and signs that are text where they stand keep their look in the file itself.
func md(s string) string {
	var b strings.Builder
	before := ' '
	for i, r := range source.Visible(s) {
		escape := strings.ContainsRune("\\`*_{}[]<>#|~&$^", r)
		switch r {
		case '(': // of a link
			escape = before == ']'
		case '+', '-': // of a list
			escape = i == 0
		}
		before = r
		if escape {
			if r == '<' || r == '>' || r == '&' {
				b.WriteString(map[rune]string{'<': "&lt;", '>': "&gt;", '&': "&amp;"}[r])
				continue
			}
			b.WriteByte('\\')
		}
		b.WriteRune(r)
	}
	var marked bytes.Buffer // Markdown is read in a browser, too
	markText(&marked, []byte(b.String()))
	return marked.String()
}

// Markdown writes the change report as Markdown with tables.
func Markdown(w io.Writer, d *assessment.Document, r Record) error {
	m := &markdown{c: &d.Computed}
	m.title(d, r)
	m.verdict(d)
	m.findings()
	m.trains()
	m.track()
	m.changes()
	m.declared()
	m.fleet()
	m.figures()
	m.sources()
	m.signOffs(r)
	m.add("\n## Caution\n\n%s\n", Caution)
	_, err := io.WriteString(w, m.b.String())
	return err
}

// markdown is a change report in the making.
type markdown struct {
	b strings.Builder
	c *assessment.Computed
}

func (m *markdown) add(format string, args ...any) { fmt.Fprintf(&m.b, format, args...) }

func (m *markdown) title(d *assessment.Document, r Record) {
	c := m.c
	state := "not recorded"
	if r.Number != 0 {
		state = fmt.Sprintf("assessment %d, %s%s", r.Number, r.State, reviewWords(r))
	}
	m.add("# Change of route speed data: %s (%s)\n\n", md(titled(c.Dataset)), state)
	line := func(what, words string) { m.add("- %s: %s\n", what, words) }
	line("base", md(revisionName(d.Named.Base, d.Named.BaseName, c.Base)+details(c.Base)))
	line("target", md(revisionName(d.Named.Target, d.Named.TargetName, c.Target)+details(c.Target)))
	if c.Folder != "." {
		line("folder", md(c.Folder))
	}
	if len(c.Preparers) > 0 {
		line("prepared by", md(people(c.Preparers)+countedWords(c)))
	}
	for _, q := range c.Requests {
		line("request "+md(q.ID), md(q.Title))
	}
	if r.Digest != "" {
		line("digest", r.Digest)
	}
}

// verdict writes the statement that says most, and the others below it.
func (m *markdown) verdict(d *assessment.Document) {
	parts := verdictParts(d)
	m.add("\n## Verdict\n\n**%s**\n", md(parts[0]))
	for i, s := range parts[1:] {
		if i == 0 {
			m.add("\n")
		}
		m.add("- %s\n", md(s))
	}
}

func (m *markdown) findings() {
	c := m.c
	m.add("\n## What needs eyes first\n")
	groups := findingGroups(c)
	if len(groups) == 0 {
		m.add("\n%s\n", noFinding)
	}
	for _, g := range groups {
		text, tail := g.commonTail(1)
		m.add("\n### %s\n\n%s\n\n", md(g.title()), md(g.Why+" "+g.Do+tail))
		for i, f := range g.List {
			if i == mostHTMLFindings {
				m.add("- and %d more, in the JSON form\n", len(g.List)-i)
				break
			}
			m.add("- ")
			if place := findingPlace(f); place != "" {
				m.add("**%s**: ", md(place))
			}
			m.add("%s", md(text[i]))
			if f.Row != "" {
				m.add(" (%s)", md(findingRow(f)))
			}
			if f.Accepted != "" {
				m.add(" Accepted: %s", md(f.Accepted))
			}
			m.add("\n")
			if f.Example != "" {
				m.add("\n%s\n", shifted(source.VisibleLines(f.Example), "      "))
			}
		}
	}
	if text := limitWords(c); text != "" {
		m.add("\n%s\n", md(text))
	}
}

func (m *markdown) trains() {
	c := m.c
	m.add("\n## Trains\n")
	times, routes := runningTimes(c), trainRoutes(c)
	var rows [][]string
	for _, t := range c.Trains {
		name := md(t.ID)
		if t.Fate != "kept" {
			name += " (" + t.Fate + ")"
		}
		if routes[t.ID] == "" {
			rows = append(rows, []string{name, "", "", "", "", "", unchangedWords(c, t)})
			continue
		}
		rows = append(rows, []string{name, lengthCell(t.Raised), lengthCell(t.Lowered), stepCell(t.LargestRaise), stepCell(-t.LargestReduction), times[t.ID], md(routes[t.ID])})
	}
	m.table([]string{"train", ">raised, km", ">lowered, km", ">largest raise, km/h", ">largest reduction, km/h", ">running time, s", "routes"}, rows)
	m.add("\nLengths and running times (minus: faster) are added up over both directions of travel.%s\n", md(otherLengths(c)))
}

// track lists the track that one revision only has.
func (m *markdown) track() {
	heading := "\n## Track that only one revision has\n\n"
	for i := range m.c.Routes {
		route := &m.c.Routes[i]
		for _, t := range route.Track {
			m.add("%s- %s %s: km %s to %s %s (%s m)\n", heading, md(route.ID), t.Direction, minus(t.From), minus(t.To), t.Fate, metres(t.Length))
			heading = ""
		}
	}
}

// changes lists the speed changes.
func (m *markdown) changes() {
	c := m.c
	m.add("\n## Changed stretches\n")
	shown, all := 0, 0
	for i := range c.Routes {
		route := &c.Routes[i]
		var rows [][]string
		for k := range route.Changes {
			x := &route.Changes[k]
			if all++; shown < mostHTMLRows {
				shown++
				step := signed(x.After - x.Before)
				if x.RunOut {
					step += " run-out"
				}
				rows = append(rows, []string{minus(x.From), minus(x.To), metres(x.Length), itoa(x.Before), itoa(x.After), step, md(trainNames(c, x.Trains, 0)), md(declaredWords(c, route, x.Pieces)),
					md(strings.Join(because(route.Sources[x.BeforeSource], route.Sources[x.AfterSource]), "; "))})
			}
			if len(rows) > 0 && (k+1 == len(route.Changes) || route.Changes[k+1].Direction != x.Direction) {
				m.add("\n### %s %s, %s\n", md(route.ID), md(route.Name), x.Direction)
				m.table([]string{">from, km", ">to, km", ">length, m", ">before, km/h", ">after, km/h", "step, km/h", "trains", "declared by", "because of"}, rows)
				rows = nil
			}
		}
	}
	switch {
	case all == 0:
		m.add("\nNone.\n")
	case all > shown:
		m.add("\n%d more changes are not shown here; --format csv lists every change.\n", all-shown)
	}
}

// shifted puts blanks before each line: in a list, that is text as it is typed.
func shifted(text, blanks string) string {
	return blanks + strings.ReplaceAll(strings.TrimRight(text, "\n"), "\n", "\n"+blanks) + "\n"
}
