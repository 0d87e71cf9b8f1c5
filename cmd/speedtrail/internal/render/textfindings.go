package render

import (
	"fmt"
	"maps"
	"slices"
	"strings"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

// How many findings of a kind the terminal shows; of that many each has its own
// lines, of more each has one below its route.
const (
	mostTextFindings = 60
	mostWholeFinding = 8
	mostRoutesNamed  = 20 // of those that are not shown
)

func (p *textWriter) findings() { p.findingsBelow("What needs eyes first", noFinding) }

// findingsBelow writes the findings below a heading, which stands there without any only
// where something is said of that.
func (p *textWriter) findingsBelow(heading, none string) {
	groups := findingGroups(p.c)
	if len(groups) > 0 || none != "" {
		p.heading(heading)
	}
	if len(groups) == 0 && none != "" {
		p.paragraph("", none)
	}
	for i, g := range groups {
		if i > 0 {
			p.printf("\n")
		}
		text, tail := g.commonTail(mostWholeFinding)
		if len(g.List) > mostWholeFinding && g.List[0].Example != "" {
			tail += " The trains stand in the report: " + p.command("html", len(g.List), mostHTMLFindings) + "."
		}
		many, apart := len(g.List) > mostWholeFinding, false
		for k := range text {
			if short, trains := g.trainsApart(text[k]); many && trains != "" {
				text[k], apart = short, true
			}
		}
		if apart {
			tail += " Long lists of trains stand in the report: " + p.command("html", len(g.List), mostHTMLFindings) + "."
		}
		p.paragraph("", g.title()+". "+g.Why+" "+g.Do+tail)
		if many {
			p.findingsByRoute(g, text)
			continue
		}
		for k, f := range g.List {
			p.paragraph(findingMark(f), joinPlace(findingPlace(f), text[k]))
			p.findingRest("    ", f)
		}
	}
	gap := "\n"
	for _, a := range p.c.Accepted {
		if a.State != "used" && a.State != "unread" {
			p.printf("%s", gap)
			p.paragraph("  ", acceptanceWords(a, p.c.Limits.Unchecked))
			gap = ""
		}
	}
}

// unchecked says which doubtful data nobody looked for.
func (p *textWriter) unchecked() {
	if text := uncheckedWords(p.c); text != "" {
		p.printf("\n")
		p.paragraph("", text)
	}
}

// findingMark begins a finding: an exclamation mark unless it is accepted.
func findingMark(f assessment.Finding) string {
	if f.Accepted != "" {
		return "  "
	}
	return "! "
}

// findingRest writes what follows the place and the text of a finding.
func (p *textWriter) findingRest(indent string, f assessment.Finding) {
	if f.Row != "" {
		p.paragraph(indent, findingRow(f))
	}
	for line := range strings.Lines(source.VisibleLines(f.Example)) {
		p.printf("%s  %s\n", indent, strings.TrimRight(line, "\n"))
	}
	if f.Accepted != "" {
		p.paragraph(indent, "accepted: "+f.Accepted)
	}
}

// findingsByRoute writes many findings of a kind, the worst of them, those of a route
// together. The routes stand in the order of their worst finding.
func (p *textWriter) findingsByRoute(g findingGroup, text []string) {
	var routes []string
	shown, left := map[string][]int{}, map[string]int{}
	for i, f := range g.List {
		switch {
		case i >= mostTextFindings:
			left[f.Route]++
			continue
		case shown[f.Route] == nil:
			routes = append(routes, f.Route)
		}
		shown[f.Route] = append(shown[f.Route], i)
	}
	for _, route := range routes {
		list := shown[route]
		together := route != "" && len(list) > 1
		if together {
			p.paragraph("  ", "on "+route)
		}
		for _, i := range list {
			f := g.List[i]
			place := findingPlace(f)
			if together {
				place = strings.TrimLeft(strings.TrimPrefix(place, route), " ,")
			}
			p.paragraph(findingMark(f), joinPlace(place, text[i])+rowTail(f))
			f.Row, f.Example = "", ""
			p.findingRest("    ", f)
		}
	}
	if n := len(g.List) - mostTextFindings; n > 0 {
		where := slices.Sorted(maps.Keys(left))
		rest := ""
		if len(where) > mostRoutesNamed {
			rest = plural(len(where)-mostRoutesNamed, "more route", "more routes")
			where = where[:mostRoutesNamed]
		}
		for i, r := range where {
			where[i] = fmt.Sprintf("%s (%d)", r, left[r])
			if r == "" {
				where[i] = fmt.Sprintf("no route (%d)", left[r])
			}
		}
		if rest != "" {
			where = append(where, rest)
		}
		p.paragraph("  ", fmt.Sprintf("and %d more, on %s; %s lists all", n, strings.Join(where, ", "), p.command("html", len(g.List), mostHTMLFindings)))
	}
}

// rowTail is the row behind a finding at the end of its line.
func rowTail(f assessment.Finding) string {
	if f.Row == "" {
		return ""
	}
	return "; " + findingRow(f)
}

// command gives the command that writes all of an assessment in a format. Where a page
// has not all of a list either, the JSON form has.
func (p *textWriter) command(format string, n, most int) string {
	if format == "html" && (n > most || p.noPage) {
		format = "json"
	}
	switch {
	case p.r.Number == 0 && format == "html":
		return "--format html --out report.html"
	case p.r.Number == 0:
		return "--format " + format
	case format == "html":
		return p.s.advise(fmt.Sprintf("speedtrail report %d --out report.html", p.r.Number))
	}
	return p.s.advise(fmt.Sprintf("speedtrail report %d --format %s", p.r.Number, format))
}

// more says that a list goes on, and which command writes all of it.
func (p *textWriter) more(n int, format string) {
	if n > 0 {
		p.paragraph("  ", fmt.Sprintf("and %d more; %s lists all", n, p.command(format, n, mostHTMLRows/2)))
	}
}
