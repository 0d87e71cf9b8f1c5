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
	c := &d.Computed
	var b strings.Builder
	add := func(format string, args ...any) { fmt.Fprintf(&b, format, args...) }
	state := "not recorded"
	if r.Number != 0 {
		state = fmt.Sprintf("assessment %d, %s%s", r.Number, r.State, reviewWords(r))
	}
	add("# Change of route speed data: %s (%s)\n\n", md(titled(c.Dataset)), state)
	add("| | |\n|---|---|\n| base | %s |\n| target | %s |\n", md(revisionName(d.Named.Base, d.Named.BaseName, c.Base)+details(c.Base)), md(revisionName(d.Named.Target, d.Named.TargetName, c.Target)+details(c.Target)))
	if c.Folder != "." {
		add("| folder | %s |\n", md(c.Folder))
	}
	if len(c.Preparers) > 0 {
		add("| prepared by | %s |\n", md(people(c.Preparers)+countedWords(c)))
	}
	for _, q := range c.Requests {
		add("| request %s | %s |\n", md(q.ID), md(q.Title))
	}
	if r.Digest != "" {
		add("| digest | %s |\n", r.Digest)
	}
	add("\n## Verdict\n\n%s\n", md(Verdict(d)))
	if groups := findingGroups(c); len(groups) > 0 {
		add("\n## Findings\n")
		for _, g := range groups {
			add("\n**%s**: %s %s\n\n", md(g.title()), md(g.Why), md(g.Do))
			for i, f := range g.List {
				if i == mostHTMLFindings {
					add("- and %d more, in the JSON form\n", len(g.List)-i)
					break
				}
				add("- %s", md(joinPlace(findingPlace(f), f.Text)))
				if f.Row != "" {
					add(" (%s)", md(findingRow(f)))
				}
				if f.Accepted != "" {
					add(" Accepted: %s", md(f.Accepted))
				}
				add("\n")
				if f.Example != "" {
					add("\n%s\n", shifted(source.VisibleLines(f.Example), "      "))
				}
			}
		}
	}
	if text := limitWords(c); text != "" {
		add("\n%s\n", md(text))
	}
	add("\n## Trains\n\n| train | raised, km | lowered, km | largest raise, km/h | largest reduction, km/h | running time, s | routes |\n|---|--:|--:|--:|--:|--:|---|\n")
	times, routes := runningTimes(c), trainRoutes(c)
	for _, t := range c.Trains {
		if routes[t.ID] == "" {
			add("| %s | | | | | | %s |\n", md(t.ID), unchangedWords(c, t))
			continue
		}
		add("| %s | %s | %s | %s | %s | %s | %s |\n", md(t.ID), lengthCell(t.Raised), lengthCell(t.Lowered), stepCell(t.LargestRaise), stepCell(-t.LargestReduction), times[t.ID], md(routes[t.ID]))
	}
	shown, all := 0, 0
	for i := range c.Routes {
		route := &c.Routes[i]
		for _, t := range route.Track {
			add("\n%s %s: km %s to %s %s (%s m)\n", md(route.ID), t.Direction, minus(t.From), minus(t.To), t.Fate, metres(t.Length))
		}
		for k := range route.Changes {
			x := &route.Changes[k]
			if all++; shown == mostHTMLRows {
				continue
			}
			shown++
			if k == 0 || x.Direction != route.Changes[k-1].Direction {
				add("\n## %s %s, %s\n\n| from, km | to, km | length, m | before, km/h | after, km/h | step | trains | before by | after by | declared by |\n|--:|--:|--:|--:|--:|--:|---|---|---|---|\n", md(route.ID), md(route.Name), x.Direction)
			}
			step := signed(x.After - x.Before)
			if x.RunOut {
				step += " run-out"
			}
			add("| %s | %s | %s | %d | %d | %s | %s | %s | %s | %s |\n", minus(x.From), minus(x.To), metres(x.Length), x.Before, x.After, step,
				md(trainNames(c, x.Trains, 0)), md(assessment.SourceText(route.Sources[x.BeforeSource])), md(assessment.SourceText(route.Sources[x.AfterSource])), md(declaredWords(c, route, x.Pieces)))
		}
	}
	if all > shown {
		add("\n%d more changes are not shown here; --format csv lists every change.\n", all-shown)
	}
	markdownAccount(&b, c)
	markdownSigned(&b, r)
	add("\n## Caution\n\n%s\n", Caution)
	_, err := io.WriteString(w, b.String())
	return err
}

// markdownAccount writes what requests declare, the whole fleet, the figures and
// the source rows.
func markdownAccount(b *strings.Builder, c *assessment.Computed) {
	add := func(format string, args ...any) { fmt.Fprintf(b, format, args...) }
	add("\n## Declared against observed\n\n%s\n", md(reconciliation(c)))
	if len(c.Requests) > 0 {
		add("\n| request | route | direction | from, km | to, km | effect | trains | seen |\n|---|---|---|--:|--:|---|---|---|\n")
		for _, q := range c.Requests {
			for _, d := range q.Declares {
				seen := seenWords(d)
				if c.Options.NoRequests {
					seen = "not looked at"
				}
				add("| %s | %s | %s | %s | %s | %s | %s | %s |\n", md(q.ID), md(d.Route), d.Direction, minus(d.From), minus(d.To), d.Effect, md(declaredTrains(d)), md(seen))
			}
		}
	}
	if len(c.Fleet) > 0 {
		add("\n## Whole fleet\n")
	}
	lines := 0
	for i := range c.Fleet {
		f := &c.Fleet[i]
		if lines += len(f.Changes) + 1; lines > mostHTMLRows {
			add("\n%d more accounts, one a route and direction, stand in the JSON form.\n", len(c.Fleet)-i)
			break
		}
		add("\n%s: **%s**\n\n", md(fleetTitle(f)), md(fleetStatement(f)))
		for _, l := range fleetLines(f) {
			mark := ""
			if !l.Represented {
				mark = " **(no reference train)**"
			}
			add("- %s: %s, %s%s\n", md(l.Who), md(l.Step), md(l.Where), mark)
		}
	}
	f := &c.Figures
	if len(f.Crossings)+len(f.Curves)+len(f.Short)+len(f.Runs) > 0 {
		add("\n## Figures\n")
	}
	list := func(title string, lines []string) {
		if len(lines) > 0 {
			add("\n%s\n\n", md(title))
		}
		for _, line := range lines {
			add("- %s\n", md(line))
		}
	}
	var crossings, curves, short []string
	for _, x := range f.Crossings {
		crossings = append(crossings, x.Route+" "+x.Direction+", km "+minus(x.Km)+" "+x.Name+": "+crossingLine(x))
	}
	shownCurves, _ := bounded(curvesOfInterest(f.Curves))
	for _, x := range shownCurves {
		curves = append(curves, x.Route+" "+directionWords(x.Direction)+", km "+minus(x.From)+" to "+minus(x.To)+" ("+trainNames(c, x.Trains, 0)+"): "+curveLine(x))
	}
	shownShort, _ := bounded(f.Short)
	for _, x := range shownShort {
		short = append(short, x.Route+" "+x.Direction+", km "+minus(x.From)+" to "+minus(x.To)+", "+x.Train+": "+shortLine(x))
	}
	list(crossingWords, crossings)
	list(curveWords, curves)
	list("Raises too short to be used.", short)
	if len(f.Runs) > 0 {
		add("\n%s\n\n| route | direction | train | before, min:s | after, min:s | difference, s |\n|---|---|---|--:|--:|--:|\n", md(motionWords(c)))
		runs, more := bounded(f.Runs)
		for _, r := range runs {
			add("| %s | %s | %s | %s | %s | %s |\n", md(r.Route), r.Direction, md(r.Train), clock(r.Before), clock(r.After), seconds(r.After-r.Before))
		}
		if more > 0 {
			add("\n%d more running times stand in the JSON form.\n", more)
		}
	}
	add("\n## Source rows\n\n")
	results := consequences(c)
	lines = 0
	for i := range c.Source {
		s := &c.Source[i]
		if lines += len(s.Rows) + 1; lines > mostHTMLRows {
			add("- %d more files; the JSON form has them all\n", len(c.Source)-i)
			break
		}
		if len(s.Rows) == 0 {
			add("- %s: %s\n", md(fileName(*s)), md(s.Note))
		}
		for k := range s.Rows {
			d := &s.Rows[k]
			add("- %s:%s %s: %s\n", md(fileName(*s)), rowLines(d), md(rowWords(s, d)), md(effectWords(c, d, results[assessment.Cause{File: i, Row: k}])))
		}
	}
}

// shifted puts blanks before each line: in a list, that is text as it is typed.
func shifted(text, blanks string) string {
	return blanks + strings.ReplaceAll(strings.TrimRight(text, "\n"), "\n", "\n"+blanks) + "\n"
}
