package render

import (
	"fmt"
	"io"

	"speedtrail/history/assessment"
)

// Doubtful writes the doubtful data of a revision for the terminal: the findings, the
// entries of accepted.toml that cover nothing any more, and what was found in all.
func Doubtful(w io.Writer, d *assessment.Doubtful, s Style) error {
	c := &assessment.Computed{Explained: d.Explained, Findings: d.Findings, Limits: assessment.Limits{Unchecked: d.Unchecked}}
	for _, a := range d.Accepted {
		// One that cannot count, or is for a route that is not there, is remarked on by
		// validate, with what can have been meant.
		if a.State != "never" {
			c.Accepted = append(c.Accepted, a)
		}
	}
	p := &textWriter{w: w, c: c, s: s, noPage: true}
	p.findingsBelow("Doubtful data", "")
	p.printf("\n")
	open := d.Open()
	text := fmt.Sprintf("%s of doubtful data as of %s, %d of them accepted.", plural(len(d.Findings), "finding", "findings"), date(d.At), len(d.Findings)-open)
	switch len(d.Findings) {
	case 0:
		text = fmt.Sprintf("No doubtful data as of %s.", date(d.At))
	case len(d.Findings) - open:
		text = fmt.Sprintf("%s of doubtful data as of %s, accepted.", plural(len(d.Findings), "finding", "findings"), date(d.At))
	}
	p.paragraph("", text)
	return p.err
}
