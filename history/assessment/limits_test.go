package assessment_test

import (
	"reflect"
	"slices"
	"testing"

	"speedtrail/history/assessment"
)

// A change does not switch off the checks that judge it: of each limit the stricter
// of both revisions counts, as a change cannot accept its own findings.
func TestLimitsOfTheBaseCount(t *testing.T) {
	limits := func(lines string) string { return ground["dataset.toml"] + "[limits]\n" + lines }
	target := texts{
		"speed.csv":  "from_km,to_km,basic,train_length_delay\n0,4,100,no\n4,4.05,60,no\n4.05,10,100,no\n10,20,20,no\n",
		"curves.csv": "from_km,to_km,radius_m,cant_mm\n12,13,1000,120\n",
	}
	strict, loose := "cant_excess_mm = 90\nlargest_step_kmh = 60\nshortest_stretch_m = 100\n", "cant_excess_mm = 150\nlargest_step_kmh = 90\nshortest_stretch_m = 20\n"
	all := []string{"cant-excess", "short-stretch", "step-size"}
	for _, x := range []struct {
		name, base, target string
		want               []string
	}{
		{"both strict", strict, strict, all},
		{"both loose", loose, loose, nil},
		{"loosened by the change", strict, loose, all},
		{"tightened by the change", loose, strict, all},
		{"switched off by the change", strict, "", all},
		{"switched on by the change", "", strict, all},
		{"one loosened, one tightened", "largest_step_kmh = 60\nshortest_stretch_m = 20\n", "largest_step_kmh = 90\nshortest_stretch_m = 100\n", all[1:]},
	} {
		t.Run(x.name, func(t *testing.T) {
			c := compute(t, texts{"dataset.toml": limits(x.base)}, over(target, texts{"dataset.toml": limits(x.target)}), nil)
			var got []string
			for _, f := range c.Findings {
				if slices.Contains(all, f.ID) && !slices.Contains(got, f.ID) {
					got = append(got, f.ID)
				}
			}
			if slices.Sort(got); !slices.Equal(got, x.want) {
				t.Errorf("got %v, want %v", got, x.want)
			}
			for _, id := range x.want {
				if slices.Contains(c.Limits.Unchecked, id) {
					t.Errorf("%s is found and said to be unchecked", id)
				}
			}
		})
	}
}

// What nobody looks for, as neither revision sets the limit, is said.
func TestUnchecked(t *testing.T) {
	limits := func(lines string) texts { return texts{"dataset.toml": ground["dataset.toml"] + "[limits]\n" + lines} }
	for _, x := range []struct {
		base, target string
		want         assessment.Limits
	}{
		{"", "", assessment.Limits{Unchecked: []string{"cant-excess", "short-stretch", "step-size"}}},
		{"largest_step_kmh = 60\n", "", assessment.Limits{LargestStep: 60, Unchecked: []string{"cant-excess", "short-stretch"}}},
		{"largest_step_kmh = 60\n", "largest_step_kmh = 70\ncant_excess_mm = 110\n", assessment.Limits{LargestStep: 60, CantExcess: 110, Unchecked: []string{"short-stretch"}}},
		{"shortest_stretch_m = 100\n", "shortest_stretch_m = 90\n", assessment.Limits{ShortestStretch: 100_000, Unchecked: []string{"cant-excess", "step-size"}}},
	} {
		// No route differs: said all the same.
		if c := compute(t, limits(x.base), limits(x.target), nil); !reflect.DeepEqual(c.Limits, x.want) {
			t.Errorf("%q, %q: got %+v, want %+v", x.base, x.target, c.Limits, x.want)
		}
	}
}
