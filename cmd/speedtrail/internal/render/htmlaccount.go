package render

import (
	"fmt"
	"strings"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

// mostHTMLFindings is how many findings of a kind a page shows.
const mostHTMLFindings = 500

type pageFindings struct {
	ID, Title, Why, Do string
	Accepted           bool
	List               []pageFinding
	More               int
}

type pageFinding struct{ Place, Link, Text, Trains, Row, Accepted, Example string }

type pageDeclaration struct {
	ID, Request, Row, Route, Direction, From, To, Effect, Trains, Seen string
	Unseen                                                             bool
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
	ID, File, Lines, Words, Effect string
}

func (p *page) fillFindings() {
	for n, g := range findingGroups(p.C) {
		text, tail := g.commonTail(1)
		out := pageFindings{ID: fmt.Sprintf("f%d", n+1), Title: g.title(), Why: g.Why, Do: source.Visible(g.Do + tail), Accepted: g.Open == 0}
		for i, f := range g.List {
			if i == mostHTMLFindings {
				out.More = len(g.List) - i
				break
			}
			what, trains := g.trainsApart(text[i])
			out.List = append(out.List, pageFinding{source.Visible(findingPlace(f)), p.anchors.of(f), tied(source.Visible(what)), source.Visible(trains), source.Visible(findingRow(f)), source.Visible(f.Accepted), source.VisibleLines(f.Example)})
		}
		p.Findings = append(p.Findings, out)
	}
	for _, a := range p.C.Accepted {
		p.Acceptances = append(p.Acceptances, source.Visible(acceptanceWords(a, p.C.Limits.Unchecked)))
	}
}

func (p *page) fillDeclared() {
	p.Reconciliation = reconciliation(p.C)
	for _, q := range p.C.Requests {
		p.Requests = append(p.Requests, "")
		for i, d := range q.Declares {
			id := declarationAnchor(len(p.Declared))
			if i == 0 {
				p.Requests[len(p.Requests)-1] = id
			}
			seen := seenWords(d)
			if p.C.Options.NoRequests {
				seen = "not looked at"
			}
			p.Declared = append(p.Declared, pageDeclaration{
				ID: id, Request: q.ID, Row: source.Visible(q.File) + ":" + itoa(d.Line), Route: d.Route, Direction: d.Direction, From: minus(d.From), To: minus(d.To),
				Effect: d.Effect, Trains: declaredTrains(d), Seen: seen, Unseen: d.Unseen,
			})
		}
	}
}

func (p *page) fillFleet() {
	lines := 0
	for i := range p.C.Fleet {
		f := &p.C.Fleet[i]
		if lines += len(f.Changes) + 1; lines > mostHTMLRows {
			p.FleetLeft = len(p.C.Fleet) - i
			break
		}
		p.Fleet = append(p.Fleet, pageFleet{source.Visible(fleetTitle(f)), tied(fleetStatement(f)), tiedLines(fleetLines(f))})
	}
}

func (p *page) fillFigures() {
	f := &p.C.Figures
	p.Motion, p.CrossingWords, p.CurveWords = source.Visible(motionWords(p.C)), crossingWords, curveWords
	runs, more := bounded(f.Runs)
	p.RunsLeft = more
	for _, r := range runs {
		run := pageRun{Route: r.Route, Direction: r.Direction, Train: r.Train, Before: clock(r.Before), After: clock(r.After), Difference: seconds(r.After - r.Before)}
		for _, part := range r.Parts {
			if len(r.Parts) > 1 && part.Gain != 0 {
				run.Parts = append(run.Parts, tied("km "+minus(part.From)+" to "+minus(part.To))+": "+seconds(-part.Gain))
				p.RunParts = true
			}
		}
		p.Runs = append(p.Runs, run)
	}
	for _, x := range f.Crossings {
		p.Crossings = append(p.Crossings, pageLineItem{source.Visible(x.Route + " " + x.Direction + ", km " + minus(x.Km) + " " + x.Name), tied(crossingLine(x)), x.Warning > x.After})
	}
	curves, more := bounded(curvesOfInterest(f.Curves))
	p.CurvesLeft = more
	for _, x := range curves {
		p.Curves = append(p.Curves, pageLineItem{source.Visible(x.Route + " " + directionWords(x.Direction) + ", km " + minus(x.From) + " to " + minus(x.To) + " (" + trainNames(p.C, x.Trains, 0) + ")"), tied(source.Visible(curveLine(x))), x.Over})
	}
	short, more := bounded(f.Short)
	p.ShortLeft = more
	for _, x := range short {
		p.Short = append(p.Short, pageLineItem{source.Visible(x.Route + " " + x.Direction + ", km " + minus(x.From) + " to " + minus(x.To) + ", " + x.Train), tied(shortLine(x)), false})
	}
}

// bounded cuts a list to what a page holds, and says how many were cut.
func bounded[T any](list []T) (shown []T, more int) {
	if len(list) <= mostHTMLRows {
		return list, 0
	}
	return list[:mostHTMLRows], len(list) - mostHTMLRows
}

// fillRows lists the rows that differ: those with an effect, and the others.
func (p *page) fillRows() {
	results := consequences(p.C)
	for i := range p.C.Source {
		f := &p.C.Source[i]
		if len(f.Rows) == 0 {
			p.Quiet = append(p.Quiet, pageSourceRow{File: source.Visible(fileName(*f)), Effect: noSpeed + f.Note})
		}
		for k := range f.Rows {
			d := &f.Rows[k]
			row := pageSourceRow{
				File: source.Visible(fileName(*f)), Lines: rowLines(d), Words: source.Visible(rowWords(f, d)),
				Effect: source.Visible(effectWords(p.C, d, results[assessment.Cause{File: i, Row: k}])),
			}
			if d.Effect == "none" && !holdsForOthers(d) {
				row.Effect = strings.TrimPrefix(row.Effect, noSpeed)
				if len(p.Quiet) < mostHTMLRows {
					row.ID = p.anchors.addRow(f, d)
				}
				p.Quiet = append(p.Quiet, row)
				continue
			}
			if len(p.Rows) < mostHTMLRows {
				row.ID = p.anchors.addRow(f, d)
			}
			p.Rows = append(p.Rows, row)
		}
	}
	p.Rows, p.RowsLeft = bounded(p.Rows)
	p.Quiet, p.QuietLeft = bounded(p.Quiet)
}
