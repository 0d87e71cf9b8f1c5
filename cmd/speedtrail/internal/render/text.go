package render

import (
	"cmp"
	"fmt"
	"io"
	"strings"

	"github.com/jedib0t/go-pretty/v6/table"
	"github.com/jedib0t/go-pretty/v6/text"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

// mostTextChanges is how many changes the terminal shows; CSV has all of them.
const mostTextChanges = 200

// Text writes an assessment for the terminal.
func Text(w io.Writer, d *assessment.Document, r Record, s Style) error {
	p := &textWriter{w: w, d: d, c: &d.Computed, r: r, s: s}
	p.title()
	p.verdict()
	p.findings()
	p.trains()
	if s.Brief {
		return p.err
	}
	p.track()
	p.changes()
	p.declared()
	p.fleet()
	p.figures()
	p.sources()
	p.signOffs()
	p.end()
	return p.err
}

type textWriter struct {
	w   io.Writer
	d   *assessment.Document
	c   *assessment.Computed
	r   Record
	s   Style
	err error
}

func (p *textWriter) printf(format string, args ...any) {
	if p.err == nil {
		_, p.err = fmt.Fprintf(p.w, format, args...)
	}
}

// paragraph writes a text wrapped to the width, with what hides made visible.
func (p *textWriter) paragraph(indent, s string) {
	for i, line := range wrap(source.Visible(s), p.s.Width-len(indent)) {
		if i == 1 {
			indent = strings.Repeat(" ", len(indent))
		}
		p.printf("%s%s\n", indent, line)
	}
}

func (p *textWriter) heading(s string) {
	if p.s.Color {
		p.printf("\n\x1b[1m%s\x1b[0m\n", s)
		return
	}
	p.printf("\n%s\n", strings.ToUpper(s))
}

func (p *textWriter) title() {
	state := "not recorded"
	if p.r.Number != 0 {
		state = fmt.Sprintf("assessment %d, %s", p.r.Number, p.r.State)
	}
	p.paragraph("", fmt.Sprintf("Change of route speed data: %s (%s)", p.c.Dataset, state))
	side := func(word, typed, name string, r assessment.Revision) {
		p.paragraph(fmt.Sprintf("%-10s", word), revisionName(typed, name, r)+details(r))
	}
	side("base", p.d.Named.Base, p.d.Named.BaseName, p.c.Base)
	side("target", p.d.Named.Target, p.d.Named.TargetName, p.c.Target)
	for i, q := range p.c.Requests {
		word := "requests"
		if i > 0 {
			word = ""
		}
		p.paragraph(fmt.Sprintf("%-10s", word), q.ID+"  "+q.Title)
	}
	if len(p.c.Preparers) > 0 {
		p.paragraph("prepared  ", people(p.c.Preparers)+countedWords(p.c))
	}
	if p.r.Digest != "" {
		p.printf("%-10s%s\n", "digest", p.r.Digest)
	}
}

// details gives date and subject of a commit.
func details(r assessment.Revision) string {
	if r.Commit == "" {
		return ""
	}
	return ", " + cmp.Or(date(r.Committed), noTime) + ", " + r.Subject
}

// countedWords says from where preparers are counted, where that is not the base.
func countedWords(c *assessment.Computed) string {
	if c.PreparedSince == "" {
		return ""
	}
	return fmt.Sprintf(" (counted from %.10s, the approved commit of the base's content)", c.PreparedSince)
}

func people(list []assessment.Person) string {
	names := make([]string, len(list))
	for i, p := range list {
		names[i] = p.String()
	}
	return strings.Join(names, ", ")
}

func (p *textWriter) verdict() {
	p.heading("Verdict")
	p.paragraph("", Verdict(p.d))
}

// mostTextFindings is how many findings of a kind the terminal shows.
const mostTextFindings = 12

func (p *textWriter) findings() {
	groups := findingGroups(p.c)
	if len(groups) == 0 {
		return
	}
	p.heading("What needs eyes first")
	for i, g := range groups {
		if i > 0 {
			p.printf("\n")
		}
		p.paragraph("", g.title()+". "+g.Why+" "+g.Do)
		for k, f := range g.List {
			if k == mostTextFindings {
				p.printf("  and %d more, in the JSON form\n", len(g.List)-k)
				break
			}
			mark := "! "
			if f.Accepted != "" {
				mark = "  "
			}
			p.paragraph(mark, joinPlace(findingPlace(f), f.Text))
			if f.Row != "" {
				p.paragraph("    ", findingRow(f))
			}
			for line := range strings.Lines(source.VisibleLines(f.Example)) {
				p.printf("      %s\n", strings.TrimRight(line, "\n"))
			}
			if f.Accepted != "" {
				p.paragraph("    ", "accepted: "+f.Accepted)
			}
		}
	}
	for _, a := range p.c.Accepted {
		if a.State != "used" && a.State != "unread" {
			p.paragraph("  ", acceptanceWords(a))
		}
	}
}

var right = []table.ColumnConfig{
	{Number: 2, Align: text.AlignRight, AlignHeader: text.AlignRight}, {Number: 3, Align: text.AlignRight, AlignHeader: text.AlignRight},
	{Number: 4, Align: text.AlignRight, AlignHeader: text.AlignRight}, {Number: 5, Align: text.AlignRight, AlignHeader: text.AlignRight},
	{Number: 6, Align: text.AlignRight, AlignHeader: text.AlignRight},
}

func (p *textWriter) trains() {
	p.heading("Trains")
	t := plainTable()
	t.AppendHeader(table.Row{"train", "raised km", "lowered km", "up km/h", "down km/h", "time s", "routes"})
	t.SetColumnConfigs(append([]table.ColumnConfig{{Number: 7, WidthMax: max(12, p.s.Width-68), WidthMaxEnforcer: text.WrapSoft}}, right...))
	times := runningTimes(p.c)
	for _, x := range p.c.Trains {
		name := source.Visible(x.ID)
		if x.Fate != "kept" {
			name += " (" + x.Fate + ")"
		}
		if len(x.Routes) == 0 {
			t.AppendRow(table.Row{name, "no change", "", "", "", "", ""})
			continue
		}
		t.AppendRow(table.Row{name, lengthCell(x.Raised), lengthCell(x.Lowered), stepCell(x.LargestRaise), stepCell(-x.LargestReduction), times[x.ID], source.Visible(strings.Join(x.Routes, ", "))})
	}
	p.printf("%s\n", tidy(t.Render()))
	p.paragraph("", "Up and down are the largest steps. Lengths, and running times (minus: faster), are added up over routes and both directions of travel.")
}

func lengthCell(mm int64) string {
	if mm == 0 {
		return ""
	}
	return km(mm)
}

func stepCell(n int) string {
	if n == 0 {
		return ""
	}
	return signed(n)
}

func (p *textWriter) track() {
	heading := false
	for _, r := range p.c.Routes {
		for _, t := range r.Track {
			if !heading {
				p.heading("Track that only one revision has")
				heading = true
			}
			p.paragraph("", fmt.Sprintf("%s %s, %s: %s to %s km %s (%s m)", r.ID, r.Name, t.Direction, minus(t.From), minus(t.To), t.Fate, metres(t.Length)))
		}
	}
}

func (p *textWriter) changes() {
	shown, all := 0, 0
	pictures := picturesOf(p.c)
	for i := range p.c.Routes {
		r := &p.c.Routes[i]
		for list := r.Changes; len(list) > 0; {
			n := 1
			for n < len(list) && list[n].Direction == list[0].Direction {
				n++
			}
			fs := families(list[:n])
			all += len(fs)
			if room := mostTextChanges - shown; room > 0 {
				p.heading(source.Visible(fmt.Sprintf("Changes on %s %s, %s", r.ID, r.Name, list[0].Direction)))
				fs = fs[:min(len(fs), room)]
				shown += len(fs)
				for _, f := range fs {
					p.family(r, f, pictures)
				}
			}
			list = list[n:]
		}
	}
	if all > shown {
		p.printf("\n%d more are not shown here; --format csv lists every change.\n", all-shown)
	}
}

// family writes changes that differ only in their trains and one of their ends.
func (p *textWriter) family(r *assessment.Route, f family, pictures pictures) {
	x := f.all[0]
	step := signed(x.After - x.Before)
	if p.s.Color {
		color := "31" // raised: look first
		if x.After < x.Before {
			color = "34"
		}
		step = "\x1b[" + color + "m" + step + "\x1b[0m"
	}
	line := fmt.Sprintf("km %s to %s", between(f.from[0].From, f.from[1].From), between(f.to[0].To, f.to[1].To))
	remark := ""
	if x.RunOut {
		remark = "  run-out"
	}
	switch {
	case f.begin() && f.end():
	case pictures.byLength(r, &f):
		remark += "  by train length"
	default:
		remark += "  by train"
	}
	p.printf("%-34s %3d to %3d km/h  %s%s\n", line, x.Before, x.After, step, remark)
	p.paragraph("    ", trainNames(p.c, f.trains, 0))
	for _, line := range because(r.Sources[x.BeforeSource], r.Sources[x.AfterSource]) {
		p.paragraph("    ", line)
	}
	if text := declaredFamily(p.c, r, f); text != "" {
		p.paragraph("    ", "declared by: "+text)
	}
}

func (p *textWriter) end() {
	p.printf("\n")
	p.paragraph("", "Caution: "+Caution)
	if p.r.Number != 0 {
		p.printf("\nnext: speedtrail report %d --out report.html\n", p.r.Number)
	}
}
