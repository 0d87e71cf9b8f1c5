package assessment_test

import (
	"fmt"
	"strings"
	"testing"
	"time"

	"speedtrail/history/assessment"
)

func acceptance(finding, route string, from, to float64, until string) string {
	text := fmt.Sprintf("[[accepted]]\nfinding = %q\nroute = %q\nfrom_km = %v\nto_km = %v\nreason = \"Note 1\"\n", finding, route, from, to)
	if until != "" {
		text += "until = " + until + "\n"
	}
	return text
}

// An entry of accepted.toml takes findings out of the exit status only where it
// stands unaltered in the base, still counts, and covers them wholly; what moves
// a speed unannounced cannot be accepted.
func TestAcceptance(t *testing.T) {
	// A short stretch from 4 to 4.05 for one reason, a large step at 10 for
	// another.
	base := texts{
		"dataset.toml": ground["dataset.toml"] + "[limits]\nshortest_stretch_m = 100\nlargest_step_kmh = 60\n",
		"speed.csv":    "from_km,to_km,basic,train_length_delay\n0,4,100,no\n4,4.05,60,no\n4.05,10,100,no\n10,20,30,no\n",
		"places.csv":   "km,kind,name\n1,station,Ash\n",
	}
	differs := texts{"places.csv": "km,kind,name\n1,station,Elm\n"}
	short, stepAt := acceptance("short-stretch", "R1", 4, 4.05, ""), acceptance("step-size", "R1", 9, 11, "")
	for _, x := range []struct {
		name       string
		old, now   string // accepted.toml
		target     texts
		at         time.Time
		states     string // of the entries, with what they cover
		accepted   string // ids of the findings that count no more
		unaccepted string // ids of those that count
	}{
		{"nothing", gone, gone, nil, at, "", "", "short-stretch step-size"},
		{"exactly the stretch", short, short, nil, at, "used 1", "short-stretch", "step-size"},
		{"both", short + stepAt, short + stepAt, nil, at, "used 1; used 1", "short-stretch step-size", ""},
		{"moved in its file", short + stepAt, "# moved\n" + stepAt + short, nil, at, "used 1; used 1", "short-stretch step-size", ""},
		{"a metre short of the stretch", acceptance("short-stretch", "R1", 4, 4.049, ""), acceptance("short-stretch", "R1", 4, 4.049, ""), nil, at, "unused 0", "", "short-stretch step-size"},
		{"a metre beyond its beginning", acceptance("short-stretch", "R1", 4.001, 5, ""), acceptance("short-stretch", "R1", 4.001, 5, ""), nil, at, "unused 0", "", "short-stretch step-size"},
		{"a point at the end of the range", acceptance("step-size", "R1", 5, 10, ""), acceptance("step-size", "R1", 5, 10, ""), nil, at, "used 1", "step-size", "short-stretch"},
		{"the point alone", acceptance("step-size", "R1", 10, 10, ""), acceptance("step-size", "R1", 10, 10, ""), nil, at, "used 1", "step-size", "short-stretch"},
		{"the point beside it", acceptance("step-size", "R1", 10.001, 10.001, ""), acceptance("step-size", "R1", 10.001, 10.001, ""), nil, at, "unused 0", "", "short-stretch step-size"},
		{"another finding", acceptance("cant-excess", "R1", 0, 20, ""), acceptance("cant-excess", "R1", 0, 20, ""), nil, at, "unused 0", "", "short-stretch step-size"},
		{"new", gone, short, nil, at, "new 0", "", "accepted-changed short-stretch step-size"},
		{"one more", short, short + stepAt, nil, at, "used 1; new 0", "short-stretch", "accepted-changed step-size"},
		{"wider", short, acceptance("short-stretch", "R1", 4, 5, ""), nil, at, "new 0", "", "accepted-changed short-stretch step-size"},
		{"another reason", short, strings.Replace(short, "Note 1", "Note 2", 1), nil, at, "new 0", "", "accepted-changed short-stretch step-size"},
		{"a later last day", acceptance("short-stretch", "R1", 4, 5, "2026-03-31"), acceptance("short-stretch", "R1", 4, 5, "2026-04-30"), nil, at, "new 0", "", "accepted-changed short-stretch step-size"},
		{"its last day", acceptance("short-stretch", "R1", 4, 5, "2026-03-01"), acceptance("short-stretch", "R1", 4, 5, "2026-03-01"), nil, at, "used 1", "short-stretch", "step-size"},
		{"the last second of it", acceptance("short-stretch", "R1", 4, 5, "2026-03-01"), acceptance("short-stretch", "R1", 4, 5, "2026-03-01"), nil, time.Date(2026, 3, 1, 23, 59, 59, 0, time.UTC), "used 1", "short-stretch", "step-size"},
		{"the day after", acceptance("short-stretch", "R1", 4, 5, "2026-03-01"), acceptance("short-stretch", "R1", 4, 5, "2026-03-01"), nil, time.Date(2026, 3, 2, 0, 0, 0, 0, time.UTC), "over 0", "", "short-stretch step-size"},
		{"the day of the time zone of the data set", acceptance("short-stretch", "R1", 4, 5, "2026-03-01"), acceptance("short-stretch", "R1", 4, 5, "2026-03-01"),
			texts{"dataset.toml": ground["dataset.toml"] + "time_zone = \"America/New_York\"\n[limits]\nshortest_stretch_m = 100\nlargest_step_kmh = 60\n"}, time.Date(2026, 3, 2, 4, 59, 0, 0, time.UTC), "used 1", "short-stretch", "dates-changed step-size"},
		{"a route that is the same on both sides, or none", acceptance("short-stretch", "R9", 0, 20, ""), acceptance("short-stretch", "R9", 0, 20, ""), nil, at, "unread 0", "", "short-stretch step-size"},
		{"what cannot be accepted", acceptance("outside", "R1", 0, 20, "") + acceptance("not-represented", "R1", 0, 20, ""), acceptance("outside", "R1", 0, 20, "") + acceptance("not-represented", "R1", 0, 20, ""),
			texts{"speed.csv": strings.Replace(base["speed.csv"], "10,20,30", "10,20,35", 1)}, at, "never 0; never 0", "", "outside short-stretch step-size"},
		{"a name that is no finding", acceptance("stepsize", "R1", 0, 20, ""), acceptance("stepsize", "R1", 0, 20, ""), nil, at, "never 0", "", "short-stretch step-size"},
		{"positions that the target has no more", acceptance("short-stretch", "R1", 3, 25, ""), acceptance("short-stretch", "R1", 3, 25, ""), nil, at, "unused 0", "", "short-stretch step-size"},
		{"a first occurrence that is marked where nothing repeats", strings.Replace(short, "from_km = 4\n", "from_km = \"4#1\"\n", 1), strings.Replace(short, "from_km = 4\n", "from_km = \"4#1\"\n", 1), nil, at, "used 1", "short-stretch", "step-size"},
	} {
		t.Run(x.name, func(t *testing.T) {
			old := over(base, texts{"accepted.toml": x.old})
			target := over(over(differs, texts{"accepted.toml": x.now}), x.target)
			c := compute(t, old, target, func(in *assessment.Input) { in.At = x.at })
			var states, accepted, unaccepted []string
			for _, a := range c.Accepted {
				states = append(states, fmt.Sprintf("%s %d", a.State, a.Covers))
			}
			for _, f := range c.Findings {
				list := &unaccepted
				if f.Accepted != "" {
					list = &accepted
					if f.Accepted != "Note 1" {
						t.Errorf("%s is accepted because %q", f.ID, f.Accepted)
					}
				}
				if n := len(*list); n == 0 || (*list)[n-1] != f.ID {
					*list = append(*list, f.ID)
				}
			}
			if got := strings.Join(states, "; "); got != x.states {
				t.Errorf("states: got %q, want %q", got, x.states)
			}
			if got := strings.Join(accepted, " "); got != x.accepted {
				t.Errorf("accepted: got %q, want %q", got, x.accepted)
			}
			if got := strings.Join(unaccepted, " "); got != x.unaccepted {
				t.Errorf("unaccepted: got %q, want %q", got, x.unaccepted)
			}
		})
	}
}

// None of the findings that move a speed unannounced, or decide about changes,
// can be accepted, even by an entry of the base.
func TestNeverAcceptable(t *testing.T) {
	for _, id := range []string{
		assessment.Outside, assessment.Unseen, assessment.NotRepresented, assessment.Masked, assessment.PolicyChanged, assessment.AcceptedChanged,
		assessment.BaseNotAncestor, assessment.TrainsChanged, assessment.RunOutLeavesRoute,
	} {
		entry := acceptance(id, "R1", 0, 20, "")
		base := over(policy(1), texts{"accepted.toml": entry, "speed.csv": "from_km,to_km,basic,cd150\n0,10,100,\n10,12,80,\n12,20,100,\n", "temporary.csv": "id,from_km,to_km,speed\nA,10,11,40\n"})
		target := over(policy(2), texts{
			"accepted.toml": entry + acceptance("step-size", "R1", 0, 1, ""), "trains.toml": trainText("T", 80, "", "C2", 250, 200),
			"speed.csv":       "from_km,to_km,basic,cd150\n0,10,100,\n10,12,90,\n12,20,100,120\n",
			"requests/1.toml": "id = \"CR-1\"\ntitle = \"A\"\nreason = \"B\"\n[[declares]]\nroute = \"R1\"\nfrom_km = 1\nto_km = 2\neffect = \"any\"\n",
		})
		c := compute(t, base, target, func(in *assessment.Input) { in.BaseIsAncestor = false })
		found := 0
		for _, f := range c.Findings {
			if f.ID == id {
				found++
			}
			if f.Accepted != "" {
				t.Errorf("%s accepted by an entry for %s", f.ID, id)
			}
		}
		if found == 0 || c.Accepted[0].State != "never" {
			t.Errorf("%s: %d findings, the entry is %q", id, found, c.Accepted[0].State)
		}
	}
}
