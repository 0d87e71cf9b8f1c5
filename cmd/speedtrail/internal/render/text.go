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
	p.unchecked()
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
	// noPage: what is written has no HTML form that could hold more.
	noPage bool
}

func (p *textWriter) printf(format string, args ...any) {
	if p.err == nil {
		_, p.err = fmt.Fprintf(p.w, format, args...)
	}
}

// paragraph writes a text wrapped to the width, with what hides made visible.
func (p *textWriter) paragraph(indent, s string) {
	for i, line := range Wrap(source.Visible(s), max(minWidth, p.s.Width-len(indent))) {
		if i == 1 {
			indent = strings.Repeat(" ", len(indent))
		}
		p.printf("%s%s\n", indent, line)
	}
}

// heading begins a part. Names, as that of a route, keep their letters.
func (p *textWriter) heading(s string, names ...string) {
	if !p.s.Color {
		s = strings.ToUpper(s)
	}
	p.printf("\n")
	for i, line := range Wrap(s+" "+source.Visible(strings.Join(names, " ")), p.s.Width-2) {
		if i > 0 {
			line = "  " + line
		}
		if p.s.Color {
			line = "\x1b[1m" + line + "\x1b[0m"
		}
		p.printf("%s\n", line)
	}
}

func (p *textWriter) title() {
	state := "not recorded"
	if p.r.Number != 0 {
		state = fmt.Sprintf("assessment %d, %s%s", p.r.Number, p.r.State, reviewWords(p.r))
	}
	p.paragraph("", fmt.Sprintf("Change of route speed data: %s (%s)", titled(p.c.Dataset), state))
	side := func(word, typed, name string, r assessment.Revision) {
		p.paragraph(fmt.Sprintf("%-10s", word), revisionName(typed, name, r)+details(r))
	}
	side("base", p.d.Named.Base, p.d.Named.BaseName, p.c.Base)
	side("target", p.d.Named.Target, p.d.Named.TargetName, p.c.Target)
	if p.c.Folder != "." {
		p.paragraph("folder    ", p.c.Folder)
	}
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

// titled writes the name of a data set where a state follows it in brackets: a name
// that has brackets of its own stands in quotes.
func titled(name string) string {
	if strings.ContainsAny(name, "()") {
		return source.Quote(name)
	}
	return name
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

var right = []table.ColumnConfig{
	{Number: 2, Align: text.AlignRight, AlignHeader: text.AlignRight}, {Number: 3, Align: text.AlignRight, AlignHeader: text.AlignRight},
	{Number: 4, Align: text.AlignRight, AlignHeader: text.AlignRight}, {Number: 5, Align: text.AlignRight, AlignHeader: text.AlignRight},
	{Number: 6, Align: text.AlignRight, AlignHeader: text.AlignRight},
}

func (p *textWriter) trains() {
	p.heading("Trains")
	t := plainTable()
	times, routes := runningTimes(p.c), trainRoutes(p.c)
	names, widest := make([]string, len(p.c.Trains)), 0
	for i, x := range p.c.Trains {
		names[i] = source.Visible(x.ID)
		if x.Fate != "kept" {
			names[i] += " (" + x.Fate + ")"
		}
		widest = max(widest, Cells(names[i]))
	}
	raised, lowered := make([]string, len(names)), make([]string, len(names))
	for i, x := range p.c.Trains {
		raised[i], lowered[i] = lengthCell(x.Raised), lengthCell(x.Lowered)
	}
	raised, lowered = onPoint(raised), onPoint(lowered)
	// Names are given what they need beside the numbers, but for room for a route.
	const gap, aRoute = 2, 12
	room := 0
	heads := columnHeads([]string{"raised km", "lowered km", "up km/h", "down km/h", "time s"}, p.s.Width-9-2*gap-aRoute, func(heads []string) int {
		numbers := 0
		for i, h := range heads {
			widths := [...]int{0, 0, 4, 4, 0} // steps are three digits and a sign
			widest := max(widths[i], headWidth(h))
			for k, x := range p.c.Trains {
				widest = max(widest, Cells([...]string{raised[k], lowered[k], "", "", times[x.ID]}[i]))
			}
			numbers += widest + gap
		}
		room = p.s.Width - numbers - 2*gap
		return numbers
	})
	t.AppendHeader(table.Row{"train", heads[0], heads[1], heads[2], heads[3], heads[4], "routes"})
	widest = max(9, min(widest, room-aRoute)) // "(removed)"
	t.SetColumnConfigs(append([]table.ColumnConfig{
		{Number: 1, WidthMax: widest, WidthMaxEnforcer: text.WrapSoft},
		{Number: 7, WidthMax: max(8, room-widest), WidthMaxEnforcer: text.WrapSoft},
	}, right...))
	for i, x := range p.c.Trains {
		name := names[i]
		if routes[x.ID] == "" {
			// In the column of a number if it is no wider than that, else in the last one,
			// which may wrap.
			row := table.Row{name, "", "", "", "", "", unchangedWords(p.c, x)}
			if words := unchangedWords(p.c, x); len(words) <= max(headWidth(heads[0]), Cells(raised[i])) {
				row[1], row[6] = words, ""
			}
			t.AppendRow(row)
			continue
		}
		t.AppendRow(table.Row{name, raised[i], lowered[i], stepCell(x.LargestRaise), stepCell(-x.LargestReduction), times[x.ID], source.Visible(routes[x.ID])})
	}
	p.printf("%s\n", tidy(t.Render()))
	p.paragraph("", "Up and down are the largest steps. Lengths, and running times (minus: faster), are added up over routes and both directions of travel."+otherLengths(p.c))
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
			p.paragraph("", fmt.Sprintf("%s %s, %s: km %s to %s %s (%s m)", r.ID, r.Name, t.Direction, minus(t.From), minus(t.To), t.Fate, metres(t.Length)))
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
				p.heading("Changes on", r.ID, r.Name+",", list[0].Direction)
				fs = fs[:min(len(fs), room)]
				shown += len(fs)
				for i, place := range familyPlaces(fs) {
					p.family(r, fs[i], place, pictures)
				}
			}
			list = list[n:]
		}
	}
	if all > shown {
		p.printf("\n")
		p.more(all-shown, "csv")
	}
}

// familyPlaces words where families are, one below the other: the place that all of a
// family begin at, or the last of them, and that where they end, or the first, stand
// on the decimal point.
func familyPlaces(list []family) []string {
	from, to := make([]string, len(list)), make([]string, len(list))
	earlier, later := make([]string, len(list)), make([]string, len(list))
	width := 0
	for i, f := range list {
		from[i], to[i] = minus(f.from[1].From), minus(f.to[0].To)
		if first := minus(f.from[0].From); first != from[i] {
			earlier[i] = first + " .. "
		}
		if last := minus(f.to[1].To); last != to[i] {
			later[i] = " .. " + last
		}
		width = max(width, Cells(earlier[i]))
	}
	from, to = onPoint(from), onPoint(to)
	out := make([]string, len(list))
	whole := 0
	for i := range list {
		out[i] = "km " + strings.Repeat(" ", width-Cells(earlier[i])) + earlier[i] + from[i] + " to " + to[i] + later[i]
		whole = max(whole, Cells(out[i]))
	}
	for i := range out {
		out[i] = padded(out[i], whole)
	}
	return out
}

// family writes changes that differ only in their trains and one of their ends.
func (p *textWriter) family(r *assessment.Route, f family, place string, pictures pictures) {
	x := f.all[0]
	step := fmt.Sprintf("%4s", signed(x.After-x.Before))
	if p.s.Color {
		color := "31" // raised: look first
		if x.After < x.Before {
			color = "34"
		}
		step = "\x1b[" + color + "m" + step + "\x1b[0m"
	}
	line := fmt.Sprintf("%s %3d to %3d km/h ", padded(place, 34), x.Before, x.After)
	var remarks []string
	if x.RunOut {
		remarks = append(remarks, "run-out")
	}
	switch {
	case f.begin() && f.end():
	case pictures.byLength(r, &f):
		remarks = append(remarks, "by train length")
	default:
		remarks = append(remarks, "by train")
	}
	remark := strings.Join(remarks, ", ")
	if remark != "" && Cells(line)+6+Cells(remark) <= p.s.Width {
		step, remark = step+"  "+remark, ""
	}
	p.printf("%s%s\n", line, step)
	if remark != "" {
		p.paragraph("    ", remark)
	}
	p.paragraph("    ", trainNames(p.c, f.trains, 0))
	for _, line := range because(r.Sources[x.BeforeSource], r.Sources[x.AfterSource]) {
		p.paragraph("    ", line)
	}
	if text := declaredFamily(p.c, r, f); text == outside {
		p.paragraph("    ", "declared by no request (outside)")
	} else if text != "" {
		p.paragraph("    ", "declared by: "+text)
	}
}

func (p *textWriter) end() {
	p.printf("\n")
	p.paragraph("", "Caution: "+Caution)
	p.printf("\n")
	if s := findingSentence(p.c); s != "" { // the verdict is far above by now
		p.paragraph("", s)
	}
	if command := p.oneTrain(); command != "" {
		p.advice("one train:", source.Visible(p.s.advise(command)))
	}
	if p.r.Number != 0 {
		p.advice("next:", source.Visible(p.s.advise(fmt.Sprintf("speedtrail report %d --out report.html", p.r.Number))))
	} else {
		p.printf("next: the same call with --out report.html writes the report\n")
	}
}

// advice writes a command to be copied: on a line of its own where it does not fit
// beside its label. It stays whole.
func (p *textWriter) advice(label, command string) {
	if Cells(label)+1+Cells(command) > p.s.Width {
		label += "\n "
	}
	p.printf("%s %s\n", label, command)
}

// oneTrain gives the command that shows the profile after the change of a train that
// changes; empty where none does.
func (p *textWriter) oneTrain() string {
	for i := range p.c.Routes {
		r := &p.c.Routes[i]
		for k := range r.Changes {
			x := &r.Changes[k]
			for _, n := range x.Trains {
				if t := &p.c.Trains[n]; t.After != nil {
					return profileCommand(p.c, &p.c.Target, r.ID, x.Direction, t.ID)
				}
			}
		}
	}
	return ""
}
