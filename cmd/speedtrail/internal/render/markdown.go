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
func md(s string) string {
	var b strings.Builder
	for _, r := range source.Visible(s) {
		if strings.ContainsRune("\\`*_{}[]()<>#+!|~&$^", r) {
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
	m.add("\n## Verdict\n\n%s\n", md(Verdict(d)))
	m.findings()
	m.trains()
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
	m.add("| | |\n|---|---|\n| base | %s |\n| target | %s |\n", md(revisionName(d.Named.Base, d.Named.BaseName, c.Base)+details(c.Base)), md(revisionName(d.Named.Target, d.Named.TargetName, c.Target)+details(c.Target)))
	if c.Folder != "." {
		m.add("| folder | %s |\n", md(c.Folder))
	}
	if len(c.Preparers) > 0 {
		m.add("| prepared by | %s |\n", md(people(c.Preparers)+countedWords(c)))
	}
	for _, q := range c.Requests {
		m.add("| request %s | %s |\n", md(q.ID), md(q.Title))
	}
	if r.Digest != "" {
		m.add("| digest | %s |\n", r.Digest)
	}
}

func (m *markdown) findings() {
	c := m.c
	if groups := findingGroups(c); len(groups) > 0 {
		m.add("\n## Findings\n")
		for _, g := range groups {
			m.add("\n**%s**: %s %s\n\n", md(g.title()), md(g.Why), md(g.Do))
			for i, f := range g.List {
				if i == mostHTMLFindings {
					m.add("- and %d more, in the JSON form\n", len(g.List)-i)
					break
				}
				m.add("- %s", md(joinPlace(findingPlace(f), f.Text)))
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
	}
	if text := limitWords(c); text != "" {
		m.add("\n%s\n", md(text))
	}
}

func (m *markdown) trains() {
	c := m.c
	m.add("\n## Trains\n\n| train | raised, km | lowered, km | largest raise, km/h | largest reduction, km/h | running time, s | routes |\n|---|--:|--:|--:|--:|--:|---|\n")
	times, routes := runningTimes(c), trainRoutes(c)
	for _, t := range c.Trains {
		if routes[t.ID] == "" {
			m.add("| %s | | | | | | %s |\n", md(t.ID), unchangedWords(c, t))
			continue
		}
		m.add("| %s | %s | %s | %s | %s | %s | %s |\n", md(t.ID), lengthCell(t.Raised), lengthCell(t.Lowered), stepCell(t.LargestRaise), stepCell(-t.LargestReduction), times[t.ID], md(routes[t.ID]))
	}
	if words := otherLengths(c); words != "" {
		m.add("\n%s\n", md(strings.TrimSpace(words)))
	}
}

// changes lists the speed changes, and the track that one revision only has.
func (m *markdown) changes() {
	c := m.c
	shown, all := 0, 0
	for i := range c.Routes {
		route := &c.Routes[i]
		for _, t := range route.Track {
			m.add("\n%s %s: km %s to %s %s (%s m)\n", md(route.ID), t.Direction, minus(t.From), minus(t.To), t.Fate, metres(t.Length))
		}
		for k := range route.Changes {
			x := &route.Changes[k]
			if all++; shown == mostHTMLRows {
				continue
			}
			shown++
			if k == 0 || x.Direction != route.Changes[k-1].Direction {
				m.add("\n## %s %s, %s\n\n| from, km | to, km | length, m | before, km/h | after, km/h | step | trains | before by | after by | declared by |\n|--:|--:|--:|--:|--:|--:|---|---|---|---|\n", md(route.ID), md(route.Name), x.Direction)
			}
			step := signed(x.After - x.Before)
			if x.RunOut {
				step += " run-out"
			}
			m.add("| %s | %s | %s | %d | %d | %s | %s | %s | %s | %s |\n", minus(x.From), minus(x.To), metres(x.Length), x.Before, x.After, step,
				md(trainNames(c, x.Trains, 0)), md(sourcePlaces(route.Sources[x.BeforeSource])), md(sourcePlaces(route.Sources[x.AfterSource])), md(declaredWords(c, route, x.Pieces)))
		}
	}
	if all > shown {
		m.add("\n%d more changes are not shown here; --format csv lists every change.\n", all-shown)
	}
}

// shifted puts blanks before each line: in a list, that is text as it is typed.
func shifted(text, blanks string) string {
	return blanks + strings.ReplaceAll(strings.TrimRight(text, "\n"), "\n", "\n"+blanks) + "\n"
}
