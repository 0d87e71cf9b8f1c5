package assessment

import (
	"slices"
	"testing"

	"speedtrail/schema/codes"
)

// Findings of both directions are joined in pairs, each one once.
func TestJoinDirections(t *testing.T) {
	nominal, reverse, both := codes.Nominal.String(), codes.Reverse.String(), codes.Both.String()
	for name, c := range map[string]struct{ directions, want []string }{
		"one":                   {[]string{nominal}, []string{nominal}},
		"a pair":                {[]string{nominal, reverse}, []string{both}},
		"two pairs":             {[]string{nominal, nominal, reverse, reverse}, []string{both, both}},
		"two pairs, one by one": {[]string{nominal, reverse, nominal, reverse}, []string{both, both}},
		"one too many":          {[]string{reverse, nominal, nominal}, []string{both, nominal}},
		"of both already":       {[]string{both, both, nominal}, []string{both, both, nominal}},
		"of none":               {[]string{"", ""}, []string{"", ""}},
	} {
		t.Run(name, func(t *testing.T) {
			collected := &collector{}
			for _, d := range c.directions {
				collected.add(ranked{Finding: Finding{ID: Outside, Direction: d, Text: "the same"}})
			}
			collected.joinDirections()
			var got []string
			for _, f := range collected.list {
				got = append(got, f.Direction)
			}
			if !slices.Equal(got, c.want) {
				t.Errorf("got %q, want %q", got, c.want)
			}
		})
	}
	// What differs in anything else is not joined.
	c := &collector{}
	c.add(ranked{Finding: Finding{ID: Outside, Direction: nominal, Text: "one"}})
	c.add(ranked{Finding: Finding{ID: Outside, Direction: reverse, Text: "another"}})
	if c.joinDirections(); len(c.list) != 2 {
		t.Errorf("%v", c.list)
	}
}
