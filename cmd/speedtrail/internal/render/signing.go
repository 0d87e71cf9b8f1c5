package render

import (
	"io"

	"speedtrail/history/assessment"
)

// BeforeSigning writes what decides for somebody who is about to sign: what is
// compared, the verdict and the findings with their places and rows, which rows alter
// when temporary restrictions hold, and what nobody looked for.
func BeforeSigning(w io.Writer, d *assessment.Document, r Record, s Style) error {
	p := &textWriter{w: w, d: d, c: &d.Computed, r: r, s: s}
	p.title()
	p.verdict()
	p.findings()
	for i, row := range rowsOfDates(p.c) {
		if i == 0 {
			p.printf("\n")
		}
		if i == mostTextRows {
			p.more(len(rowsOfDates(p.c))-i, "html")
			break
		}
		p.paragraph("! ", "other dates: "+row)
	}
	p.unchecked()
	p.printf("\n")
	return p.err
}
