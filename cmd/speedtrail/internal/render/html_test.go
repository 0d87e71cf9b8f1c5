package render

import (
	"html"
	"regexp"
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// pageDocument is a document with a change, one that is hidden today, and track
// that is added, on a route of a given id.
func pageDocument(id string) *assessment.Document {
	file := "routes/r/speed.csv"
	governs := func(line, value int) []assessment.Source {
		return []assessment.Source{{File: file, Kind: "basic", Line: line, Value: value}}
	}
	change := func(from, to string, start, length int64) assessment.Change {
		return assessment.Change{Direction: "nominal", From: from, To: to, Start: start, Length: length, Before: 60, After: 80, BeforeSource: 0, AfterSource: 1, Trains: []int{0}}
	}
	r := assessment.Route{
		ID: id, Name: id, Fate: "kept", Start: "0.000", End: "9.000",
		Changes: []assessment.Change{change("1.000", "2.000", 1e6, 1e6)}, Masked: []assessment.Change{change("4.000", "5.000", 4e6, 1e6)},
		Sources: [][]assessment.Source{governs(2, 60), governs(2, 80)}, Causes: [][]assessment.Cause{{{}}},
		Pieces: [][]assessment.Piece{{{By: 1, From: "1.000", To: "2.000"}}},
		Track:  []assessment.TrackPiece{{Direction: "nominal", Fate: "added", From: "8.000", To: "9.000", Length: 1e6}},
	}
	step := []assessment.Step{{From: 0, To: 9e6, Speed: 60}}
	finding := func(kind, from, to string) assessment.Finding {
		return assessment.Finding{ID: kind, Route: id, Direction: "nominal", From: from, To: to, Text: "text", Row: file + ":2"}
	}
	return &assessment.Document{Computed: assessment.Computed{
		Dataset: "N", Folder: ".", Target: assessment.Revision{Commit: "0123456789abcdef"},
		Trains:   []assessment.Train{{ID: id, Fate: "kept", Before: &assessment.Definition{}, After: &assessment.Definition{}, Routes: []string{id}}},
		Routes:   []assessment.Route{r},
		Requests: []assessment.Request{{ID: id, Title: id, File: "requests/a.toml", Declares: []assessment.Declaration{{Route: id, Unseen: true}, {Route: id, Line: 9}}}},
		Source: []assessment.SourceFile{{Base: file, Target: file, Rows: []assessment.RowDiff{{Kind: "altered", Effect: "changes", BaseLines: []int{2}, TargetLines: []int{2},
			Cells: []assessment.CellDiff{{Column: "basic", Before: "60", After: "80"}}}}}},
		Findings: []assessment.Finding{finding(assessment.Outside, "1.000", "2.100"), finding(assessment.Masked, "4.000", "5.000"), finding(assessment.Outside, "4.000", "5.000"), finding("step-size", "7.000", "7.000")},
		Stretches: assessment.Stretches{List: []assessment.Stretch{{Direction: "nominal", Changes: []int{0}, Trains: []int{0}, From: 1e6, To: 2e6, WindowTo: 3e6, RouteLength: 9e6,
			Before: step, After: step, Segments: []assessment.Segment{{To: 9e6}}}}},
	}}
}

func pageOf(t *testing.T, d *assessment.Document) string {
	t.Helper()
	var b strings.Builder
	if err := HTML(&b, d, Record{}); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// Every link of a page leads to a part of it, and ids are numbers of the page's
// own, whatever the data is called.
func TestPageLinks(t *testing.T) {
	for _, id := range []string{"R1", `"><a href="#x`, "javascript:alert(1)"} {
		s := pageOf(t, pageDocument(id))
		ids := map[string]bool{}
		for _, m := range regexp.MustCompile(`\sid="([^"]*)"`).FindAllStringSubmatch(s, -1) {
			if ids[m[1]] {
				t.Errorf("%q: the id %q stands twice", id, m[1])
			}
			if !regexp.MustCompile(`^[a-z]+([0-9]+(-[0-9]+(c-[td])?)?)?$`).MatchString(m[1]) {
				t.Errorf("%q: the id %q", id, m[1])
			}
			ids[m[1]] = true
		}
		links := regexp.MustCompile(`href="([^"]*)"`).FindAllStringSubmatch(s, -1)
		for _, m := range links {
			if !strings.HasPrefix(m[1], "#") || !ids[m[1][1:]] {
				t.Errorf("%q: the link %q leads nowhere", id, m[1])
			}
		}
		name := html.EscapeString(id)
		for what, link := range map[string]string{
			"the declared change of a finding": `<a href="#s1-1">` + name + " nominal, km\u00a01.000 to 2.100</a>",
			"the hidden change of a finding":   `<a href="#h1">` + name + " nominal, km\u00a04.000 to 5.000</a>",
			"the row":                          `<a href="#r1">routes/r/speed.csv:2 basic: 60 now 80` + "\u00a0km/h</a>",
			"the declaration":                  `<a href="#d2">` + name + `</a></td>`,
			"the request":                      `<b><a href="#d1">` + name + `</a></b>`,
			"a section":                        `<a href="#hidden">Hidden today</a>`,
		} {
			if !strings.Contains(s, link) {
				t.Errorf("%q: no link to %s", id, what)
			}
		}
		if n := strings.Count(s, `<a href="#h1">`); n != 2 {
			t.Errorf("%q: %d links to the hidden change", id, n)
		}
	}
}

// What temporary restrictions hide today stands in a table, and its route in the
// filter, also where nothing else changes.
func TestPageHidden(t *testing.T) {
	d := pageDocument("R1")
	d.Computed.Routes[0].Changes, d.Computed.Stretches.List = nil, nil
	d.Computed.Routes[0].Masked = append(d.Computed.Routes[0].Masked, d.Computed.Routes[0].Masked[0])
	d.Computed.Trains = append(d.Computed.Trains, assessment.Train{ID: "T2", Fate: "kept"})
	d.Computed.Routes[0].Masked[1].Trains = []int{1}
	s := pageOf(t, d)
	_, s, _ = strings.Cut(s, `<section id="changes">`)
	s, _, _ = strings.Cut(s, `<section id="declared">`)
	for _, want := range []string{"<option>R1</option>", `data-trains="R1&#10;T2"`, "<td>4.000</td><td>5.000</td><td>1000</td><td>60</td><td>80</td><td><b>+20</b>", "routes/r/speed.csv:2 basic: 60 now 80\u00a0km/h", `see what temporary restrictions <a href="#hidden">hide</a>`} {
		if !strings.Contains(html.UnescapeString(s), html.UnescapeString(want)) {
			t.Errorf("no %s", want)
		}
	}
	if n := strings.Count(s, "<td>4.000</td>"); n != 1 || !strings.Contains(s, `<td class="text">R1, T2</td>`) {
		t.Errorf("rows that read the same are %d", n)
	}
}

// A change that one train sees as others do, and that is declared for them alone, has
// a row of its own beside theirs.
func TestPageDeclaredForSome(t *testing.T) {
	d := pageDocument("R1")
	c := &d.Computed
	c.Trains = append(c.Trains, assessment.Train{ID: "T2", Fate: "kept"})
	r := &c.Routes[0]
	other := r.Changes[0]
	other.Trains, other.Pieces = []int{1}, len(r.Pieces)
	r.Pieces = append(r.Pieces, []assessment.Piece{{By: -1, From: "1.000", To: "2.000"}})
	r.Changes = append(r.Changes, other)
	c.Stretches.List[0].Trains = []int{0, 1} // its changes are those of the first
	_, s, _ := strings.Cut(pageOf(t, d), `<section id="changes">`)
	s, _, _ = strings.Cut(s, `<section id="hidden">`)
	for _, want := range []string{`<td class="text">R1</td>`, `<td class="text">T2</td><td class="text"><b class="outside">outside</b></td>`} {
		if !strings.Contains(s, want) {
			t.Errorf("no %s", want)
		}
	}
}

// The speeds of added track stand nowhere in a comparison: the page gives the
// command that shows them, and what it takes from the data is quoted.
func TestPageTrack(t *testing.T) {
	for id, word := range map[string]string{"R1": "R1", "R 1'; rm x": `R 1'\''; rm x`} {
		quote := ""
		if word != id {
			quote = "'"
		}
		want := "speedtrail profile 0123456789 " + quote + "--route=" + word + quote + " --direction=nominal " + quote + "--train=" + word + quote + "</code>"
		if s := html.UnescapeString(pageOf(t, pageDocument(id))); !strings.Contains(s, want) {
			t.Errorf("no %s", want)
		}
	}
}

// The filter compares ids as its list shows them, whatever stands in them.
func TestFilterIDs(t *testing.T) {
	c := &assessment.Computed{Trains: []assessment.Train{{ID: "A, B"}, {ID: "C\u202eD"}}}
	if got, want := filterIDs(c, []int{0, 1}), "A, B\nC\\u202eD"; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
}
