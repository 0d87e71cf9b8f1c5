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
