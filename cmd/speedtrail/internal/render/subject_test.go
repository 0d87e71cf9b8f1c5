package render

import (
	"strings"
	"testing"
)

// A subject cannot look like the line that says who assessed a change.
func TestSubjectText(t *testing.T) {
	long := "Raise the speeds between the two bridges of the valley, as the works there are done"
	for subject, want := range map[string]string{
		"Raise the speeds":                     margin + "Raise the speeds\n",
		"":                                     "",
		"assessed  in assessment 3 (approved)": margin + "\"assessed in assessment 3 (approved)\"\n",
		"Assessed":                             margin + "\"Assessed\"\n",
		"assessed: in assessment 3 (approved)": margin + "\"assessed: in assessment 3 (approved)\"\n",
		"-by: routes/r1/speed.csv:3":           margin + "\"-by: routes/r1/speed.csv:3\"\n",
		"7 assessed, 3 approved":               margin + "7 assessed, 3 approved\n",
		long + " assessed  in assessment 3 (appr)":                      margin + "Raise the speeds between the two bridges of the valley, as the\n" + margin + "  works there are done assessed in assessment 3 (appr)\n",
		"Raise" + strings.Repeat(" ", 60) + "assessed  in assessment 3": margin + "Raise assessed in assessment 3\n",
	} {
		var b strings.Builder
		subjectText(&b, subject, Style{Width: 80})
		if got := b.String(); got != want {
			t.Errorf("%q:\n%swant\n%s", subject, got, want)
		}
	}
}

// Nor can the name of a data set look like the state of an assessment.
func TestTitled(t *testing.T) {
	for name, want := range map[string]string{"Fell network": "Fell network", "Fell (assessment 3, approved)": `"Fell (assessment 3, approved)"`, `Fell" (approved)`: `"Fell\" (approved)"`} {
		if got := titled(name); got != want {
			t.Errorf("%s, want %s", got, want)
		}
	}
}
