package render

import (
	"bytes"
	"strings"
	"testing"

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
