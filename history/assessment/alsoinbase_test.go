package assessment_test

import (
	"fmt"
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// Doubtful data that the base has in the same place, by its own trains and limits
// and at the time of the target, was not brought by the change; what the change
// brought stands first.
func TestAlsoInBase(t *testing.T) {
	base := texts{
		"dataset.toml":  ground["dataset.toml"] + "[limits]\nshortest_stretch_m = 100\nlargest_step_kmh = 60\n",
		"speed.csv":     "from_km,to_km,basic,train_length_delay\n0,4,100,no\n4,4.05,60,no\n4.05,10,100,no\n10,20,30,no\n",
		"temporary.csv": "id,from_km,to_km,speed,valid_to\nA,10,11,20,2026-02-15\n",
	}
	// Doubts that name a row of another table, and another row of the same one.
	curved := texts{
		"speed.csv":  "from_km,to_km,direction,basic,train_length_delay\n0,4,both,200,yes\n4,6,nominal,100,no\n4,6,reverse,100,yes\n6,20,both,200,yes\n",
		"curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,900,100\n",
	}
	t.Run("other rows that move down", func(t *testing.T) {
		c := compute(t, curved, texts{
			"speed.csv":  "# why\nfrom_km,to_km,direction,basic,train_length_delay\n0,4,both,200,yes\n# why\n4,6,nominal,100,no\n4,6,reverse,100,yes\n6,20,both,200,yes\n",
			"curves.csv": "from_km,to_km,radius_m,cant_mm\n# why\n1,2,900,100\n",
		}, nil)
		ids := map[string]bool{}
		for _, f := range c.Findings {
			ids[f.ID] = true
			if !f.AlsoInBase {
				t.Errorf("%s, %s, is said to be new", f.ID, f.Text)
			}
		}
		if !ids["curve-speed"] || !ids["delay-one-sided"] {
			t.Errorf("findings of %v", ids)
		}
	})
	for _, x := range []struct {
		name   string
		target texts
		want   string
	}{
		{"another row, which moves the others down", texts{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,1,100,no\n1,2,90,no\n2,4,100,no\n4,4.05,60,no\n4.05,10,100,no\n10,20,30,no\n"},
			"short-stretch 4.000 old, step-size 10.000 old, temporary-expired 10.000 old"},
		{"a step more", texts{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,4,100,no\n4,4.05,60,no\n4.05,10,100,no\n10,15,30,no\n15,20,100,no\n"},
			"short-stretch 4.000 old, step-size 15.000 new, step-size 10.000 old, temporary-expired 10.000 old"},
		{"a greater step at the same place", texts{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,4,100,no\n4,4.05,60,no\n4.05,10,110,no\n10,20,30,no\n"},
			"short-stretch 4.000 old, step-size 10.000 new, temporary-expired 10.000 old"},
		{"a stretch that begins later", texts{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,4.01,100,no\n4.01,4.05,60,no\n4.05,10,100,no\n10,20,30,no\n"},
			"short-stretch 4.010 new, step-size 10.000 old, temporary-expired 10.000 old"},
		{"a lower limit, which the base does not have", texts{"dataset.toml": ground["dataset.toml"] + "[limits]\nshortest_stretch_m = 100\nlargest_step_kmh = 35\n", "places.csv": "km,kind,name\n1,station,Elm\n"},
			"short-stretch 4.000 old, step-size 4.000 new, step-size 4.050 new, step-size 10.000 new, temporary-expired 10.000 old"},
		{"a date of the past", texts{"temporary.csv": "id,from_km,to_km,speed,valid_to\nA,10,11,20,2026-02-14\n"},
			"dates-changed 10.000 new, short-stretch 4.000 old, step-size 10.000 old, temporary-expired 10.000 new"},
	} {
		t.Run(x.name, func(t *testing.T) {
			c := compute(t, base, x.target, nil)
			var got []string
			for _, f := range c.Findings {
				if f.ID == assessment.Outside || f.ID == assessment.Masked {
					if f.AlsoInBase {
						t.Errorf("%s is a finding of the change alone", f.ID)
					}
					continue
				}
				got = append(got, fmt.Sprintf("%s %s %s", f.ID, f.From, map[bool]string{true: "old", false: "new"}[f.AlsoInBase]))
			}
			if s := strings.Join(got, ", "); s != x.want {
				t.Errorf("got %s, want %s", s, x.want)
			}
		})
	}
}
