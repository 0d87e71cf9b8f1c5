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
		"a*b_c[d](e)":      `a\*b\_c\[d\]\(e\)`,
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
