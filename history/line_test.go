package history_test

import (
	"testing"

	"speedtrail/history"
	"speedtrail/history/assessment"
)

// The signer signs for the findings that nobody accepted, and for requests that
// nobody looked at.
func TestFindingsOfStatement(t *testing.T) {
	list := []assessment.Finding{{ID: "outside"}, {ID: "masked"}, {ID: "outside"}, {ID: "step-size", Accepted: "looked at"}}
	for _, x := range []struct {
		list       []assessment.Finding
		noRequests bool
		rules      int
		want       string
	}{
		{nil, false, 4, "none"},
		{list[3:], false, 4, "none"},
		{list, false, 4, "outside 2, masked 1"},
		{list, true, 4, "requests not looked at, outside 2, masked 1"},
		{nil, true, 4, "requests not looked at"},
		{list, true, 3, "outside 2, masked 1"},
		{nil, true, 3, "none"},
	} {
		c := &assessment.Computed{Findings: x.list, Options: assessment.Options{NoRequests: x.noRequests}, RulesVersion: x.rules}
		if got := history.Findings(c); got != x.want {
			t.Errorf("got %q, want %q", got, x.want)
		}
	}
}
