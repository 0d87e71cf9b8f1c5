package render

import (
	_ "embed" // the page
	"fmt"
	"html/template"
	"io"
	"strings"
	"sync"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

//go:embed trace.html
var traceText string

var traceTemplate = sync.OnceValue(func() *template.Template {
	return template.Must(template.New("trace").Funcs(template.FuncMap{"visible": source.Visible}).Parse(traceText))
})

const traceCSS = `
.gap > * { color: #555; font-style: italic; } .aside > * { color: #555; }
@media (min-width: 721px) { .dates td:nth-child(6), .point td:nth-child(4) { min-width: 14rem; } .dates td:nth-child(7) { min-width: 10rem; } .dates td:nth-child(8) { min-width: 11rem; } }
@media screen and (max-width: 720px) {
  .gaps.stack td { grid-column: 1 / -1; }
  .point tr:not(.gap) > td:nth-child(1)::before { content: "committed"; } .point tr:not(.gap) > td:nth-child(2)::before { content: "before, km/h"; } .point tr:not(.gap) > td:nth-child(3)::before { content: "after, km/h"; } .point tr:not(.gap) > td:nth-child(4)::before { content: "commit"; } .point tr:not(.gap) > td:nth-child(5)::before { content: "because of"; } .point tr:not(.gap) > td:nth-child(6)::before { content: "requests in play, assessment"; }
  .dates tr:not(.gap) > td:nth-child(1)::before { content: "from, km"; } .dates tr:not(.gap) > td:nth-child(2)::before { content: "to, km"; } .dates tr:not(.gap) > td:nth-child(3)::before { content: "length, m"; } .dates tr:not(.gap) > td:nth-child(4)::before { content: "km/h"; } .dates tr:not(.gap) > td:nth-child(5)::before { content: "dates from"; } .dates tr:not(.gap) > td:nth-child(6)::before { content: "commit"; } .dates tr:not(.gap) > td:nth-child(7)::before { content: "rows of today"; } .dates tr:not(.gap) > td:nth-child(8)::before { content: "requests in play, assessment"; }
  .gaps tr:not(.gap) > td:nth-child(1)::before { content: "committed"; } .gaps tr:not(.gap) > td:nth-child(2)::before { content: "commit"; } .gaps tr:not(.gap) > td:nth-child(3)::before { content: "first fault"; }
}
`

// tracePage is what the template shows.
type tracePage struct {
	Key                    string // what the speeds are
	T                      *Trace
	Title, Caution, Policy string
	CSS                    template.CSS
	Trails, Stretches      []traceSection
	Gaps                   []traceRow
	GapsLeft               int
	Cut                    []string
}

type traceSection struct {
	Title   string
	Chart   template.HTML
	Rows    []traceRow
	LeftOut int
}

type traceRow struct {
	Day, Before, After, Hash, Author, Authored, Subject string
	From, To, Length                                    string
	Because, Remarks                                    []string
	Requests, Assessments                               string
	Assessed                                            bool
	Class, Gap                                          string
}

// mostGaps bounds how many gaps a page lists in its last section.
const mostGaps = 500

// TraceHTML writes a trace as one file that needs no network.
func TraceHTML(w io.Writer, t *Trace) error {
	where := "km " + minus(t.At)
	if t.At == "" {
		where = "km " + minus(t.From) + " to " + minus(t.To)
	}
	p := tracePage{T: t, Title: source.Visible(fmt.Sprintf("%s %s, %s", t.Route, t.RouteName, where)), Caution: Caution, Key: traceKey}
	p.CSS = template.CSS(strings.Replace(pageCSS, "HEADER", "trace of "+short(t.Revision.Commit), 1) + traceCSS)
	p.Policy = "default-src 'none'; style-src '" + inlineHash(string(p.CSS)) + "'"
	for i := range t.Trails {
		trail := &t.Trails[i]
		s := traceSection{Title: source.Visible(fmt.Sprintf("%s, %s: %s at %s", trail.Direction, strings.Join(trail.Trains, ", "), speedAt(trail.Now.Speed), t.Revision.Typed))}
		// Charts are built from escaped texts and numbers only.
		s.Chart = template.HTML(t.timeChart(trail, fmt.Sprintf("p%d", i+1)))
		gaps := t.Gaps
		for k := range trail.Steps {
			step := &trail.Steps[k]
			for len(gaps) > 0 && gaps[0].Commit < step.After.Commit {
				s.Rows = append(s.Rows, t.gapRow(gaps[0]))
				gaps = gaps[1:]
			}
			s.Rows = append(s.Rows, t.stepRow(step))
		}
		for _, g := range gaps {
			s.Rows = append(s.Rows, t.gapRow(g))
		}
		p.Trails = append(p.Trails, s)
	}
	for i := range t.Stretches {
		stretch := &t.Stretches[i]
		s := traceSection{Title: source.Visible(stretch.Direction + ", " + strings.Join(stretch.Trains, ", ")), LeftOut: stretch.LeftOut}
		s.Chart = template.HTML(t.distanceChart(stretch, fmt.Sprintf("d%d", i+1)))
		for k := range stretch.Pieces {
			piece := &stretch.Pieces[k]
			row := t.row(piece.Origin)
			row.From, row.To, row.Length, row.After = minus(piece.From), minus(piece.To), metres(piece.End-piece.Start), speedWords(piece.Speed)
			row.Because = []string{source.Visible(sourcePlaces(piece.Sources))}
			row.Remarks = visible(pieceRemarks(t, piece))
			s.Rows = append(s.Rows, row)
		}
		p.Stretches = append(p.Stretches, s)
	}
	for i, g := range t.Gaps {
		if i == mostGaps {
			p.GapsLeft = len(t.Gaps) - i
			break
		}
		p.Gaps = append(p.Gaps, t.gapRow(g))
	}
	for _, c := range t.Cut {
		p.Cut = append(p.Cut, short(t.Commits[c].Hash))
	}
	return executed(w, traceTemplate(), p)
}

// row writes what is said of a commit.
func (t *Trace) row(commit int) traceRow {
	c := &t.Commits[commit]
	return traceRow{
		Day: day(c), Hash: c.Hash, Author: source.Visible(c.Author.Name), Authored: c.Authored, Subject: source.Visible(c.Subject),
		Requests: source.Visible(requestWords(c)), Assessments: source.Visible(assessmentWords(c)), Assessed: len(c.Assessments) > 0 || c.anchorWords() != "",
	}
}

// visible makes what hides in texts visible.
func visible(list []string) []string {
	for i, s := range list {
		list[i] = source.Visible(s)
	}
	return list
}

func (t *Trace) gapRow(g TraceGap) traceRow {
	row := t.row(g.Commit)
	row.Gap = source.Visible(g.Fault)
	return row
}

func (t *Trace) stepRow(s *TraceStep) traceRow {
	row := t.row(s.After.Commit)
	row.Before, row.After = "", speedWords(s.After.Speed)
	var before []assessment.Source
	if len(s.Before) > 0 {
		row.Before, before = speedWords(s.Before[0].Speed), s.Before[0].Sources
	}
	for _, line := range because(before, s.After.Sources) {
		row.Because = append(row.Because, source.Visible(line))
	}
	row.Remarks = visible(stepRemarks(t, s))
	if s.Aside {
		row.Class = "aside"
	}
	return row
}
