package render

import (
	"fmt"

	"github.com/jedib0t/go-pretty/v6/table"
	"github.com/jedib0t/go-pretty/v6/text"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

// declared sets what the requests declare against what was observed.
func (p *textWriter) declared() {
	p.heading("Declared against observed")
	p.paragraph("", reconciliation(p.c)+" Lengths are added up over both directions of travel.")
	for _, q := range p.c.Requests {
		for _, d := range q.Declares {
			p.paragraph("  ", fmt.Sprintf("%s %s %s, km %s to %s, %s, %s", q.ID, d.Route, directionWords(d.Direction), minus(d.From), minus(d.To), d.Effect, declaredTrains(d)))
			if !p.c.Options.NoRequests {
				p.paragraph("      ", "seen: "+seenWords(d))
			}
		}
	}
}

// mostTextFleet is how many changes of the whole fleet the terminal shows.
const mostTextFleet = 40

func (p *textWriter) fleet() {
	if len(p.c.Fleet) == 0 {
		return
	}
	p.heading("Whole fleet")
	p.paragraph("", "Every train that the standard can describe, by category, without a maximum speed. ! stands for trains that no reference train represents.")
	shown := 0
	for i := range p.c.Fleet {
		f := &p.c.Fleet[i]
		lines := fleetLines(f)
		if shown >= mostTextFleet {
			shown += len(lines)
			continue
		}
		p.paragraph("", fleetTitle(f)+": "+fleetStatement(f))
		for _, line := range lines {
			if shown++; shown > mostTextFleet {
				continue
			}
			mark := "    "
			if !line.Represented {
				mark = "  ! "
			}
			p.paragraph(mark, line.Who+": "+line.Step+", "+line.Where)
		}
	}
	if shown > mostTextFleet {
		p.more(shown-mostTextFleet, "html")
	}
}

// mostTextFigures is how many lines of each kind of figure the terminal shows.
const mostTextFigures = 40

// cut is how many of a list of figures the terminal does not show: none of one that
// is hardly longer.
func cut(n int) int {
	if n <= mostTextFigures+10 {
		return 0
	}
	return n - mostTextFigures
}

func (p *textWriter) figures() {
	f := &p.c.Figures
	if len(f.Runs) > 0 {
		p.heading("Running times")
		p.paragraph("", motionWords(p.c))
		t := plainTable()
		numbers := 0
		heads := columnHeads([]string{"before min:s", "after min:s", "difference s"}, p.s.Width-2*7, func(heads []string) int {
			numbers = len("direction") + 5*2 // gaps
			for _, h := range heads {
				numbers += max(headWidth(h), 8) // 100:00.0
			}
			return numbers
		})
		t.AppendHeader(table.Row{"route", "direction", "train", heads[0], heads[1], heads[2]})
		name := table.ColumnConfig{WidthMax: max(7, (p.s.Width-numbers)/2), WidthMaxEnforcer: text.WrapSoft}
		route, train := name, name
		route.Number, train.Number = 1, 3
		t.SetColumnConfigs(append([]table.ColumnConfig{route, train}, right[2:]...))
		for i, r := range f.Runs {
			if i == mostTextFigures && cut(len(f.Runs)) > 0 {
				break
			}
			t.AppendRow(table.Row{source.Visible(r.Route), r.Direction, source.Visible(r.Train), clock(r.Before), clock(r.After), seconds(r.After - r.Before)})
		}
		p.printf("%s\n", tidy(t.Render()))
		p.more(cut(len(f.Runs)), "html")
	}
	if len(f.Crossings) > 0 {
		p.heading("Level crossings")
		p.paragraph("", crossingWords)
		for _, x := range f.Crossings {
			p.paragraph("  ", fmt.Sprintf("%s %s, km %s %s: %s", x.Route, x.Direction, minus(x.Km), x.Name, crossingLine(x)))
		}
	}
	if len(f.Curves) > 0 {
		p.heading("Curves")
		p.paragraph("", curveWords)
		list := curvesOfInterest(f.Curves)
		for i, x := range list {
			if i == mostTextFigures && cut(len(list)) > 0 {
				break
			}
			p.paragraph("  ", fmt.Sprintf("%s %s, km %s to %s (%s): %s", x.Route, directionWords(x.Direction), minus(x.From), minus(x.To), trainNames(p.c, x.Trains, 6), curveLine(x)))
		}
		p.more(cut(len(list)), "html")
	}
	if len(f.Short) > 0 {
		p.heading("Raises too short to be used")
		for i, x := range f.Short {
			if i == mostTextFigures && cut(len(f.Short)) > 0 {
				break
			}
			p.paragraph("  ", fmt.Sprintf("%s %s, km %s to %s, %s: %s", x.Route, x.Direction, minus(x.From), minus(x.To), x.Train, shortLine(x)))
		}
		p.more(cut(len(f.Short)), "html")
	}
}

// mostTextRows bounds the source rows in the terminal.
const mostTextRows = 60

// sources lists the rows that differ, with what comes of each; those without an
// effect are counted, but for those that trains see which no reference train stands
// for: a mistyped speed can be one.
func (p *textWriter) sources() {
	if len(p.c.Source) == 0 {
		return
	}
	p.heading("Source rows")
	results := consequences(p.c)
	shown, quiet := 0, 0
	for i := range p.c.Source {
		f := &p.c.Source[i]
		name := false
		title := func() {
			if !name {
				name = true
				line := fileName(*f)
				if f.Note != "" {
					line += ": " + f.Note
				}
				p.paragraph("", line)
			}
		}
		if len(f.Rows) == 0 {
			title()
		}
		for k := range f.Rows {
			d := &f.Rows[k]
			if d.Effect == "none" && !movesDates(f, d) && !holdsForOthers(d) {
				quiet++
				continue
			}
			if shown++; shown > mostTextRows {
				continue
			}
			title()
			p.printf("  %s\n", Hanging(source.Visible("line "+rowLines(d)+" "+rowWords(f, d)), p.s.Width, "      "))
			p.paragraph("      ", "effect: "+effectWords(p.c, d, results[assessment.Cause{File: i, Row: k}]))
		}
	}
	if shown > mostTextRows {
		p.more(shown-mostTextRows, "html")
	}
	if quiet > 0 {
		p.paragraph("", fmt.Sprintf("%s without an effect; the HTML and Markdown reports list them with the reason.", plural(quiet, "row", "rows")))
	}
}
