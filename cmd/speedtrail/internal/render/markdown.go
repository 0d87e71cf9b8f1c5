package render

import (
	"fmt"
	"io"
	"strings"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

// md escapes what Markdown or HTML in it could take for more than text.
func md(s string) string {
	var b strings.Builder
	for _, r := range source.Visible(s) {
		if strings.ContainsRune("\\`*_{}[]()<>#+!|~&", r) {
			if r == '<' || r == '>' || r == '&' {
				b.WriteString(map[rune]string{'<': "&lt;", '>': "&gt;", '&': "&amp;"}[r])
				continue
			}
			b.WriteByte('\\')
		}
		b.WriteRune(r)
	}
	return b.String()
}

// Markdown writes the change report as Markdown with tables.
func Markdown(w io.Writer, d *assessment.Document, r Record) error {
	c := &d.Computed
	var b strings.Builder
	add := func(format string, args ...any) { fmt.Fprintf(&b, format, args...) }
	state := "not recorded"
	if r.Number != 0 {
		state = fmt.Sprintf("assessment %d, %s", r.Number, r.State)
	}
	add("# Change of route speed data: %s (%s)\n\n", md(c.Dataset), state)
	add("| | |\n|---|---|\n| base | %s |\n| target | %s |\n", md(revisionName(d.Named.Base, d.Named.BaseName, c.Base)+details(c.Base)), md(revisionName(d.Named.Target, d.Named.TargetName, c.Target)+details(c.Target)))
	if len(c.Preparers) > 0 {
		add("| prepared by | %s |\n", md(people(c.Preparers)))
	}
	for _, q := range c.Requests {
		add("| request %s | %s |\n", md(q.ID), md(q.Title))
	}
	if r.Digest != "" {
		add("| digest | %s |\n", r.Digest)
	}
	add("\n## Verdict\n\n%s\n", md(Verdict(d)))
	if len(c.Findings) > 0 {
		add("\n## Findings\n\n")
		for _, f := range c.Findings {
			then := "To do: " + f.Do
			if f.Accepted != "" {
				then = "Accepted: " + f.Accepted
			}
			add("- **%s** %s %s %s\n", md(f.ID), md(f.Text), md(f.Why), md(then))
		}
	}
	add("\n## Trains\n\n| train | raised, km | lowered, km | largest raise, km/h | largest reduction, km/h | routes |\n|---|--:|--:|--:|--:|---|\n")
	for _, t := range c.Trains {
		if len(t.Routes) == 0 {
			add("| %s | | | | | no change |\n", md(t.ID))
			continue
		}
		add("| %s | %s | %s | %s | %s | %s |\n", md(t.ID), lengthCell(t.Raised), lengthCell(t.Lowered), stepCell(t.LargestRaise), stepCell(-t.LargestReduction), md(strings.Join(t.Routes, ", ")))
	}
	shown, all := 0, 0
	for i := range c.Routes {
		route := &c.Routes[i]
		for _, t := range route.Track {
			add("\n%s %s: %s to %s km %s\n", md(route.ID), t.Direction, minus(t.From), minus(t.To), t.Fate)
		}
		for k := range route.Changes {
			x := &route.Changes[k]
			if all++; shown == mostHTMLRows {
				continue
			}
			shown++
			if k == 0 || x.Direction != route.Changes[k-1].Direction {
				add("\n## %s %s, %s\n\n| from, km | to, km | length, m | before, km/h | after, km/h | step | trains | before by | after by |\n|--:|--:|--:|--:|--:|--:|---|---|---|\n", md(route.ID), md(route.Name), x.Direction)
			}
			step := signed(x.After - x.Before)
			if x.RunOut {
				step += " run-out"
			}
			add("| %s | %s | %s | %d | %d | %s | %s | %s | %s |\n", minus(x.From), minus(x.To), metres(x.Length), x.Before, x.After, step,
				md(trainNames(c, x.Trains, 0)), md(assessment.SourceText(route.Sources[x.BeforeSource])), md(assessment.SourceText(route.Sources[x.AfterSource])))
		}
	}
	if all > shown {
		add("\n%d more changes are not shown here.\n", all-shown)
	}
	add("\n## Caution\n\n%s\n", Caution)
	_, err := io.WriteString(w, b.String())
	return err
}
