package assessment_test

import (
	"fmt"
	"testing"
)

// A doubt about a point of the track has one place, also where that point has two
// readings: a finding from the one to the other would name a stretch that is none,
// or one that other track bears.
func TestDoubtAtJoint(t *testing.T) {
	for _, x := range []struct{ name, jump, before, after, want string }{
		{"posts are missing", "arriving_km = 8\nleaving_km = 10\n", "8", "10", "10.000 to 10.000"},
		{"posts repeat", "arriving_km = 10\nleaving_km = 8\n", "10#1", "8#2", "8.000#2 to 8.000#2"},
	} {
		t.Run(x.name, func(t *testing.T) {
			base := over(oneWay, texts{
				"dataset.toml": ground["dataset.toml"] + "[limits]\nlargest_step_kmh = 60\n",
				"route.toml":   oneWay["route.toml"] + "[[jump]]\n" + x.jump,
				"speed.csv":    fmt.Sprintf("from_km,to_km,basic\n0,%s,100\n%s,20,30\n", x.before, x.after),
			})
			got := ""
			for _, f := range compute(t, base, texts{"places.csv": "km,kind,name\n1,station,Elm\n"}, nil).Findings {
				if f.ID == "step-size" {
					got += f.From + " to " + f.To
				}
			}
			if got != x.want {
				t.Errorf("got %q, want %q", got, x.want)
			}
		})
	}
}
