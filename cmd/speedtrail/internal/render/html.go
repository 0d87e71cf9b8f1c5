package render

import (
	"bytes"
	"cmp"
	"crypto/sha256"
	_ "embed" // the page's parts
	"encoding/base64"
	"fmt"
	"html/template"
	"io"
	"slices"
	"strings"
	"sync"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

// Bounds of what a page holds in full; what is left out is counted and the
// command that lists it is named.
const (
	mostHTMLRows  = 2000
	mostHTMLLines = 4000
)

//go:embed page.html
var pageText string

//go:embed page.css
var pageCSS string

//go:embed page.js
var pageJS string

// Every start of the program would pay for what is parsed here.
var pageTemplate = sync.OnceValue(func() *template.Template {
	return template.Must(template.New("page").Funcs(template.FuncMap{
		"km": km, "metres": metres, "signed": signed, "minus": minus, "short": short, "visible": source.Visible, "shown": func(s string) string { return tied(source.Visible(s)) },
		"trainName": trainName, "lengthCell": lengthCell, "stepCell": stepCell, "directionWords": directionWords, "counted": countedWords, "unchanged": unchangedWords,
		"otherLengths": func(c *assessment.Computed) string { return source.Visible(otherLengths(c)) },
		"link":         func(text, id string) pageLink { return pageLink{text, id} },
		"step":         func(p page, row pageRow) pageStep { return pageStep{row, p.C.Options.NoRequests} },
	}).Parse(pageText))
})

// page is what the template shows.
type page struct {
	D       *assessment.Document
	C       *assessment.Computed
	R       Record
	Title   string
	State   string
	Verdict []string // the first says most
	// JSONCommand is the command that writes all of it, after a comma; empty for one
	// that is not recorded.
	JSONCommand string
	// SignersCommand is the command that writes allowed_signers of the base.
	SignersCommand string
	Contents       []pageLink
	Base           string
	Target         string
	Stretches      []pageStretch
	ShownRows      int
	AllRows        int
	// Undrawn are the changes outside without a chart, and UndrawnLeft counts those that
	// have no table either.
	Undrawn     []pageTable
	UndrawnLeft int
	drawn       map[*assessment.Change]bool
	RouteLines  []pageRoute // of the routes that change, where they are many
	Lines       []pageFile
	LinesLeft   int
	Caution     string
	CSS         template.CSS
	JS          template.JS
	Policy      string
	Routes      []string // of the stretches that are drawn and of the changes that are hidden
	Trains      []string
	Track       []pageTrack
	Altered     []pageTrain
	Times       map[string]string
	Seen        map[string]string // by train, on which routes it sees a change

	Findings       []pageFindings
	NoFinding      string
	Acceptances    []string
	Reconciliation string
	Declared       []pageDeclaration
	Fleet          []pageFleet
	Runs           []pageRun
	Crossings      []pageLineItem
	Curves         []pageLineItem
	Short          []pageLineItem

	Motion, CrossingWords, CurveWords string

	Unchecked, Limits string // which doubtful data nobody looked for, and by which limits

	Standing string
	Signed   []pageSigned

	Hidden     []pageTable
	HiddenLeft int
	// Requests has, for each request, where the page lists its declarations.
	Requests []string
	anchors  anchors

	Rows, Quiet                                []pageSourceRow
	RowsLeft, QuietLeft                        int
	RunsLeft, CurvesLeft, ShortLeft, FleetLeft int
	RunParts                                   bool // some running time is made of several
}

type pageStretch struct {
	ID, Heading, Route, Names, Direction, RouteName string
	Drawn                                           string // trains of the chart, where it stands for more
	TrainIDs                                        string // joined by a line feed, for the filter
	Panels                                          []pagePanel
}

// pagePanel is a chart with its table.
type pagePanel struct {
	ID, Title string // no title where the stretch has one chart
	Chart     template.HTML
	Rows      []pageRow
}

type pageRow struct {
	From, To, Length string
	Trains           string
	Before, After    int
	Step             string
	Raised, RunOut   bool
	Declared         []pageLink
	Outside          bool
	Because          []pageLink
	trains           []int
}

// pageStep is a row with what the whole table is like.
type pageStep struct {
	Row        pageRow
	NoRequests bool
}

type pageFile struct {
	Name, Note string
	Lines      []pageLine
}

type pageLine struct {
	Number, Op, Text, Class string
}

type pageTrack struct{ ID, Route, Name, Direction, From, To, Length, Fate, Command string }

type pageTrain struct{ ID, Fate, Before, After string }

// HTML writes the change report as one file that needs no network.
func HTML(w io.Writer, d *assessment.Document, r Record) error {
	c := &d.Computed
	p := page{
		D: d, C: c, R: r, Verdict: verdictParts(d), Caution: Caution, NoFinding: noFinding, State: "not recorded",
		Title: source.Visible("Change of route speed data: " + c.Dataset),
		Base:  revisionName(d.Named.Base, d.Named.BaseName, c.Base), Target: revisionName(d.Named.Target, d.Named.TargetName, c.Target),
		JS: template.JS(pageJS), Unchecked: uncheckedWords(c), Limits: limitWords(c),
	}
	header := "not recorded"
	if r.Number != 0 {
		p.State = r.State
		p.JSONCommand = fmt.Sprintf(", speedtrail report %d --format json", r.Number)
		header = fmt.Sprintf("assessment %d, digest %s", r.Number, short(r.Digest))
	}
	p.CSS = template.CSS(strings.Replace(pageCSS, "HEADER", header, 1))
	p.Policy = "default-src 'none'; style-src '" + inlineHash(string(p.CSS)) + "'; script-src '" + inlineHash(pageJS) + "'"
	p.Times, p.Seen = runningTimes(c), trainRoutes(c)
	// What is pointed to comes before what points to it.
	p.fillRows()
	p.fillDeclared()
	p.fillStretches()
	p.fillUndrawn()
	p.fillHidden()
	p.fillTrack()
	p.fillFindings()
	p.fillSigned()
	p.fillFleet()
	p.fillFigures()
	p.fillSource()
	for _, t := range c.Trains {
		p.Trains = append(p.Trains, t.ID)
		if t.Fate != "kept" {
			p.Altered = append(p.Altered, pageTrain{t.ID, t.Fate, definitionWords(t.Before), definitionWords(t.After)})
		}
	}
	p.Routes = p.routesShown()
	p.fillRoutes()
	p.fillContents()
	return executed(w, pageTemplate(), p)
}

// executed writes a page whole.
func executed(w io.Writer, t *template.Template, p any) error {
	var b bytes.Buffer
	if err := t.Execute(&b, p); err != nil {
		return err
	}
	if hasFromTheRight(b.Bytes()) {
		return writeMarked(w, b.Bytes())
	}
	_, err := w.Write(b.Bytes())
	return err
}

// inlineHash names an inline part in a content security policy.
func inlineHash(s string) string {
	sum := sha256.Sum256([]byte(s))
	return "sha256-" + base64.StdEncoding.EncodeToString(sum[:])
}

func (p *page) fillStretches() {
	for range p.C.Rows() {
		p.AllRows++
	}
	p.drawn = map[*assessment.Change]bool{}
	list := groups(p.C)
	inReviewOrder(p.C, list)
	for i, g := range list {
		if p.ShownRows >= mostHTMLRows {
			break
		}
		s := g.drawn
		r := &p.C.Routes[s.Route]
		id := fmt.Sprintf("s%d", i+1)
		names := trainNames(p.C, g.trains, 0)
		out := pageStretch{
			ID: id, Heading: fmt.Sprintf("n%d", i+1), Route: r.ID, RouteName: r.Name, Direction: s.Direction, Names: names,
			TrainIDs: filterIDs(p.C, g.trains),
		}
		if len(s.Trains) < len(g.trains) {
			out.Drawn = trainNames(p.C, s.Trains, 0)
		}
		charts := panels(r, s)
		for n := range charts {
			chart := &charts[n]
			panel := pagePanel{ID: fmt.Sprintf("%s-%d", id, n+1)}
			// The chart is built from escaped texts and numbers only.
			panel.Chart = template.HTML(stretchFigure(p.C, s, chart).svg(panel.ID + "c"))
			if len(charts) > 1 {
				first, last := &r.Changes[chart.Changes[0]], &r.Changes[chart.Changes[len(chart.Changes)-1]]
				panel.Title = fmt.Sprintf("km %s to %s (chart %d of %d)", minus(first.From), minus(last.To), n+1, len(charts))
			}
			for _, k := range g.changes {
				if x := &r.Changes[k]; chart.holds(x) {
					panel.Rows, _ = p.appendRow(panel.Rows, r, x, g.trainsOf(x))
					p.anchors.add(r, x, panel.ID, false)
					p.drawn[x] = true
					p.ShownRows++
				}
			}
			out.Panels = append(out.Panels, panel)
		}
		p.Stretches = append(p.Stretches, out)
	}
}

// filterIDs joins the ids of trains as the filter compares them: as they are shown.
func filterIDs(c *assessment.Computed, trains []int) string {
	ids := make([]string, len(trains))
	for i, t := range trains {
		ids[i] = source.Visible(c.Trains[t].ID)
	}
	return strings.Join(ids, "\n")
}

// appendRow adds a change to a table. Changes that read the same are one row, for
// the trains of all of them. at is the row that has it.
func (p *page) appendRow(rows []pageRow, r *assessment.Route, x *assessment.Change, trains []int) (out []pageRow, at int) {
	row := pageRow{
		From: minus(x.From), To: minus(x.To), Length: metres(x.Length), Before: x.Before, After: x.After,
		Step: signed(x.After - x.Before), Raised: x.After > x.Before, RunOut: x.RunOut,
		Declared: p.declaredLinks(r, x.Pieces), Outside: isOutside(p.C, r, x.Pieces),
		Because: p.becauseLinks(r.Sources[x.BeforeSource], r.Sources[x.AfterSource]),
	}
	for i := range rows {
		old := &rows[i]
		if row.equal(old) {
			old.trains = append(old.trains, trains...)
			slices.Sort(old.trains)
			old.trains = slices.Compact(old.trains)
			old.Trains = trainNames(p.C, old.trains, 0)
			return rows, i
		}
	}
	row.trains, row.Trains = slices.Clone(trains), trainNames(p.C, trains, 0)
	return append(rows, row), len(rows)
}

// equal tells whether two rows read the same but for the trains.
func (r *pageRow) equal(o *pageRow) bool {
	return r.From == o.From && r.To == o.To && r.Length == o.Length && r.Before == o.Before && r.After == o.After && r.RunOut == o.RunOut &&
		slices.Equal(r.Declared, o.Declared) && slices.Equal(r.Because, o.Because)
}

func (p *page) fillSource() {
	lines := 0
	for _, f := range p.C.Source {
		out := pageFile{Name: source.Visible(fileName(f)), Note: f.Note}
		for _, h := range f.Hunks {
			old, now := h.BaseLine, h.TargetLine
			for _, l := range h.Lines {
				if lines++; lines > mostHTMLLines {
					p.LinesLeft++
					continue
				}
				number, class := now, map[string]string{"=": "same", "-": "gone", "+": "new"}[l.Op]
				if l.Op == "-" {
					number = old
				}
				out.Lines = append(out.Lines, pageLine{fmt.Sprint(number), map[string]string{"=": " ", "-": "\u2212", "+": "+"}[l.Op], source.Visible(l.Text), class})
				if l.Op != "+" {
					old++
				}
				if l.Op != "-" {
					now++
				}
			}
		}
		p.Lines = append(p.Lines, out)
	}
}

func fileName(f assessment.SourceFile) string {
	switch {
	case f.Target == "":
		return f.Base
	case f.Base != "" && f.Base != f.Target:
		return f.Base + " \u2192 " + f.Target
	}
	return f.Target
}

// categoryWords are the categories of trains.toml in the words of the whole fleet.
var categoryWords = map[string]string{"freight_p": "freight braked in P", "freight_g": "freight braked in G"}

// trainName gives the name of a train, for those who do not know its id; empty for
// one that says no more.
func trainName(t assessment.Train) string {
	d := t.After
	if d == nil {
		d = t.Before
	}
	if d == nil || d.Name == t.ID {
		return ""
	}
	return source.Visible(d.Name)
}

// definitionWords words a train.
func definitionWords(d *assessment.Definition) string {
	if d == nil {
		return ""
	}
	s := fmt.Sprintf("%s; cant deficiency %d mm; axle load %s; %s m long; at most %d km/h", d.Name, d.CantDeficiency, d.AxleLoad, metres(d.Length), d.MaxSpeed)
	if len(d.Categories) > 0 {
		var words []string
		for _, c := range d.Categories {
			words = append(words, cmp.Or(categoryWords[c], c))
		}
		s += "; " + strings.Join(words, ", ")
	}
	if d.Acceleration != "" || d.Braking != "" {
		s += fmt.Sprintf("; accelerates %s, brakes %s m/s²", d.Acceleration, d.Braking)
	}
	return s
}
