package render

import (
	"fmt"
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// A list of figures that is cut says so: silence would pass for "no more of them".
func TestMarkdownSaysWhatIsCut(t *testing.T) {
	d := &assessment.Document{Computed: assessment.Computed{Dataset: "Tarn"}}
	f := &d.Computed.Figures
	for range mostHTMLRows + 3 {
		f.Curves = append(f.Curves, assessment.CurveFigure{Route: "R", Direction: "nominal", Before: 80, After: 100})
		f.Short = append(f.Short, assessment.ShortFigure{Route: "R", Direction: "nominal", Train: "T"})
		f.Runs = append(f.Runs, assessment.RunFigure{Route: "R", Direction: "nominal", Train: "T"})
	}
	var b strings.Builder
	if err := Markdown(&b, d, Record{}); err != nil {
		t.Fatal(err)
	}
	for _, what := range []string{"curves", "raises", "running times"} {
		if want := fmt.Sprintf("3 more %s stand in the JSON form", what); !strings.Contains(b.String(), want) {
			t.Errorf("no %q", want)
		}
	}
}

func TestMarkdownText(t *testing.T) {
	for text, want := range map[string]string{
		"km 1.5":           "km 1.5",
		"a*b_c[d](e)":      `a\*b\_c\[d\]\(e)`,
		"(a) 7.2#1 + 3!":   `(a) 7.2\#1 + 3!`,
		"+ a":              `\+ a`,
		"<b>&":             "&lt;b&gt;&amp;",
		"a|b":              `a\|b`,
		"$1 60^{2}$":       `\$1 60\^\{2\}\$`, // 160 squared where formulas are set
		"line\nline\u202e": `line\\nline\\u202e`,
	} {
		if got := md(text); got != want {
			t.Errorf("%q became %q, want %q", text, got, want)
		}
	}
}

// Tables are read in the file itself as well: columns stand below each other, but for
// cells that are longer than the window could take.
func TestMarkdownTable(t *testing.T) {
	m := &markdown{}
	long := strings.Repeat("x", mostPadded+1)
	m.table([]string{"train", ">raised, km", "routes"}, [][]string{{"IC", "15.600", "BW1, BW4"}, {"A \\| B", "", "no change"}, {long, "1.000", "BW1"}})
	want := "\n" +
		"| train  | raised, km | routes |\n" +
		"| ------ | ---------: | --------- |\n" +
		"| IC     |     15.600 | BW1, BW4 |\n" +
		"| A \\| B |            | no change |\n" +
		"| " + long + " |      1.000 | BW1 |\n"
	if got := m.b.String(); got != want {
		t.Errorf("got%swant%s", got, want)
	}
}

// The parts of the report have the names that they have on the page.
func TestMarkdownParts(t *testing.T) {
	d := pageDocument("R1")
	var b strings.Builder
	if err := Markdown(&b, d, Record{}); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{
		"\n## What needs eyes first\n\n### outside (2)\n", "\n- **R1 nominal, km 1.000 to 2.100**: text (routes/r/speed.csv:2)\n",
		"\n## Track that only one revision has\n\n- R1 nominal: km 8.000 to 9.000 added (1000 m)\n", "\n## Changed stretches\n\n### R1 R1, nominal\n\n| from, km |",
		"| routes/r/speed.csv:2 basic: 60 now 80 km/h |\n",
	} {
		if !strings.Contains(b.String(), want) {
			t.Errorf("no %q in\n%s", want, b.String())
		}
	}
}
