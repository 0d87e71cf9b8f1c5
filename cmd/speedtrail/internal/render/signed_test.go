package render

import (
	"bytes"
	"strings"
	"testing"
	"time"

	"speedtrail/history/assessment"
)

// A command that a report tells the reader to run runs that and nothing else, whatever
// the folder is called.
func TestSignersCommand(t *testing.T) {
	for _, c := range []struct{ folder, want string }{
		{".", "(git show c0ffee:allowed_signers)"},
		{"net/lines", "(git show c0ffee:net/lines/allowed_signers)"},
		{"net; id #$(id)", "(git show &#39;c0ffee:net; id #$(id)/allowed_signers&#39;)"},
		{"it's", `(git show &#39;c0ffee:it&#39;\&#39;&#39;s/allowed_signers&#39;)`},
	} {
		d := &assessment.Document{Computed: assessment.Computed{Folder: c.folder, Base: assessment.Revision{Commit: "c0ffee"}}}
		var b bytes.Buffer
		if err := HTML(&b, d, Record{Number: 1, State: "open", SignOffs: []SignOff{{Assessment: 1}}}); err != nil {
			t.Fatal(err)
		}
		if !strings.Contains(b.String(), c.want) {
			_, after, _ := strings.Cut(b.String(), "from the base revision")
			t.Errorf("folder %q: %.200s", c.folder, after)
		}
	}
}

// The command goes through the page in lines that fit on a printed one, and is the same
// to a shell.
func TestVerifyCommandLines(t *testing.T) {
	p := page{C: &assessment.Computed{Folder: "."}}
	command := VerifyCommand("r.holm@brackwater.example", time.Date(2025, 11, 12, 11, 0, 0, 0, time.UTC))
	p.R = Record{Number: 1, SignOffs: []SignOff{{Role: "checker", Decision: "approve", Signer: "r.holm@brackwater.example", Command: command}}}
	p.fillSigned()
	if len(p.Signed) != 1 || strings.ReplaceAll(p.Signed[0].Command, " \\\n  ", " ") != command {
		t.Fatalf("%+v", p.Signed)
	}
	for line := range strings.Lines(p.Signed[0].Command) {
		if len(line) > 70 {
			t.Errorf("%q is too long", line)
		}
	}
}
