package render

import (
	"strings"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

// mostHTMLFindings is how many findings of a kind a page shows.
const mostHTMLFindings = 100

type pageFindings struct {
	Title, Why, Do string
	Accepted       bool
	List           []pageFinding
	More           int
}

type pageFinding struct{ Place, Text, Row, Accepted, Example string }

type pageDeclaration struct {
	Request, Row, Route, Direction, From, To, Effect, Trains, Seen string
	Unseen                                                         bool
}

type pageFleet struct {
	Title, Statement string
	Lines            []fleetLine
}

type pageRun struct {
	Route, Direction, Train, Before, After, Difference string
	Parts                                              []string
}

type pageLineItem struct {
	Place, Text string
	Alarm       bool
}

type pageSourceRow struct {
	File, Lines, Words, Effect string
}

func (p *page) fillFindings() {
	for _, g := range findingGroups(p.C) {
		out := pageFindings{Title: g.title(), Why: g.Why, Do: g.Do, Accepted: g.Open == 0}
		for i, f := range g.List {
			if i == mostHTMLFindings {
				out.More = len(g.List) - i
				break
			}
			out.List = append(out.List, pageFinding{source.Visible(findingPlace(f)), source.Visible(f.Text), source.Visible(f.Row), source.Visible(f.Accepted), source.VisibleLines(f.Example)})
		}
		p.Findings = append(p.Findings, out)
	}
	for _, a := range p.C.Accepted {
		p.Acceptances = append(p.Acceptances, source.Visible(acceptanceWords(a)))
	}
}

func (p *page) fillDeclared() {
	p.Reconciliation = reconciliation(p.C)
	for _, q := range p.C.Requests {
		for _, d := range q.Declares {
			seen := seenWords(d)
			if p.C.Options.NoRequests {
				seen = "not looked at"
			}
			p.Declared = append(p.Declared, pageDeclaration{
				Request: q.ID, Row: source.Visible(q.File) + ":" + itoa(d.Line), Route: d.Route, Direction: d.Direction, From: minus(d.From), To: minus(d.To),
				Effect: d.Effect, Trains: declaredTrains(d), Seen: seen, Unseen: d.Unseen,
			})
		}
	}
}

func (p *page) fillFleet() {
	for i := range p.C.Fleet {
		f := &p.C.Fleet[i]
		p.Fleet = append(p.Fleet, pageFleet{source.Visible(fleetTitle(f)), fleetStatement(f), fleetLines(f)})
	}
}

func (p *page) fillFigures() {
	f := &p.C.Figures
	p.Motion, p.CrossingWords, p.CurveWords = motionWords(p.C), crossingWords, curveWords
	for _, r := range f.Runs {
		run := pageRun{Route: r.Route, Direction: r.Direction, Train: r.Train, Before: clock(r.Before), After: clock(r.After), Difference: seconds(r.After - r.Before)}
		for _, part := range r.Parts {
			if len(r.Parts) > 1 && part.Gain != 0 {
				run.Parts = append(run.Parts, "km "+minus(part.From)+" to "+minus(part.To)+": "+seconds(-part.Gain))
			}
		}
		p.Runs = append(p.Runs, run)
	}
	for _, x := range f.Crossings {
		p.Crossings = append(p.Crossings, pageLineItem{source.Visible(x.Route + " " + x.Direction + ", km " + minus(x.Km) + " " + x.Name), crossingLine(x), x.Warning > x.After})
	}
	for _, x := range curvesOfInterest(f.Curves) {
		p.Curves = append(p.Curves, pageLineItem{source.Visible(x.Route + " " + directionWords(x.Direction) + ", km " + minus(x.From) + " to " + minus(x.To) + " (" + trainNames(p.C, x.Trains, 0) + ")"), source.Visible(curveLine(x)), x.Over})
	}
	for _, x := range f.Short {
		p.Short = append(p.Short, pageLineItem{source.Visible(x.Route + " " + x.Direction + ", km " + minus(x.From) + " to " + minus(x.To) + ", " + x.Train), shortLine(x), false})
	}
}

// fillRows lists the rows that differ: those with an effect, and the others.
func (p *page) fillRows() {
	results := consequences(p.C)
	for i := range p.C.Source {
		f := &p.C.Source[i]
		if len(f.Rows) == 0 {
			p.Quiet = append(p.Quiet, pageSourceRow{File: source.Visible(fileName(*f)), Effect: "no change: " + f.Note})
		}
		for k := range f.Rows {
			d := &f.Rows[k]
			row := pageSourceRow{
				File: source.Visible(fileName(*f)), Lines: rowLines(d), Words: source.Visible(rowWords(f, d)),
				Effect: source.Visible(effectWords(p.C, d, results[assessment.Cause{File: i, Row: k}])),
			}
			if d.Effect == "none" {
				row.Effect = strings.TrimPrefix(row.Effect, "no change: ")
				p.Quiet = append(p.Quiet, row)
				continue
			}
			p.Rows = append(p.Rows, row)
		}
	}
	if len(p.Rows) > mostHTMLRows {
		p.RowsLeft = len(p.Rows) - mostHTMLRows
		p.Rows = p.Rows[:mostHTMLRows]
	}
	if len(p.Quiet) > mostHTMLRows {
		p.QuietLeft = len(p.Quiet) - mostHTMLRows
		p.Quiet = p.Quiet[:mostHTMLRows]
	}
}
