package assessment_test

import (
	"slices"
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// Of an altered person or role it is said which one, also where the name is the same.
func TestWhoseChangeOfPolicy(t *testing.T) {
	base := policy(1)
	for name, x := range map[string]struct {
		change func(string) string
		want   string
	}{
		"a number": {func(s string) string { return strings.Replace(s, "needed = 1", "needed = 2", 1) },
			"signoff.toml differs: altered role check needed 1 now 2"},
		"a number behind a new person": {func(s string) string {
			return strings.Replace(strings.Replace(s, "needed = 1", "needed = 2", 1), "[[person]]", "[[person]]\nprincipal = \"c\"\n[[person]]", 1)
		}, "signoff.toml differs: added person c; altered role check needed 1 now 2"},
		"an address": {func(s string) string {
			return strings.Replace(s, "principal = \"b\"\n", "principal = \"b\"\nemails = [\"b@users.example\"]\n", 1)
		}, "signoff.toml differs: altered person b emails none now [\"b@users.example\"]"},
		"a name": {func(s string) string { return strings.Replace(s, "name = \"check\"", "name = \"checker\"", 1) },
			"signoff.toml differs: altered role checker name \"check\" now \"checker\""},
	} {
		t.Run(name, func(t *testing.T) {
			target := over(base, texts{"signoff.toml": x.change(base["signoff.toml"])})
			c := compute(t, base, target, nil)
			var got []string
			for _, f := range c.Findings {
				if f.ID == assessment.PolicyChanged {
					got = append(got, f.Text)
				}
			}
			if !slices.Contains(got, x.want) {
				t.Errorf("got %q, want %q", got, x.want)
			}
		})
	}
}
