package approval

import (
	"testing"
	"time"

	"speedtrail/history/chain"
	"speedtrail/history/signoff"
)

func day(n int) time.Time { return time.Date(2026, 3, n, 3, 0, 0, 0, time.UTC) }

// Who may record what is in force, and by which policy.
func TestInForceRules(t *testing.T) {
	for name, c := range map[string]struct {
		key    string
		edit   func(*signoff.Statement)
		refuse string
	}{
		"the role":             {"cem", nil, ""},
		"somebody else":        {"ada", nil, "ada@tarn.example is no signer of the role in-service"},
		"another role":         {"ada", func(st *signoff.Statement) { st.Role = "checker" }, `the role is "checker", "in-service" is needed`},
		"a strange key":        {"mal", func(st *signoff.Statement) { st.Signer = "cem@tarn.example" }, "is not allowed to anyone"},
		"another policy":       {"cem", func(st *signoff.Statement) { st.Policy = hexOf("x") }, "the statement names the policy " + hexOf("x") + ", in force is " + ordinary().hash()},
		"a folder without one": {"cem", func(st *signoff.Statement) { st.Folder = "data" }, "no policy is anchored for the folder data"},
		"another ledger":       {"cem", func(st *signoff.Statement) { st.Ledger = ledgerID[1:] + "0" }, "is for the ledger"},
		"no correction":        {"cem", func(st *signoff.Statement) { st.Corrects = "fixes 3" }, `it corrects "fixes 3"`},
		"a number with a zero": {"cem", func(st *signoff.Statement) { st.Corrects = "replaces 03" }, `it corrects "replaces 03"`},
		"no number":            {"cem", func(st *signoff.Statement) { st.Corrects = "voids" }, `it corrects "voids"`},
		"not such a record":    {"cem", func(st *signoff.Statement) { st.Corrects = "voids 2" }, "entry 2 is no in-force record that stands for this folder"},
		"itself":               {"cem", func(st *signoff.Statement) { st.Corrects = "replaces 3" }, "entry 3 is no in-force record that stands for this folder"},
	} {
		t.Run(name, func(t *testing.T) {
			s := anchored(t, ordinary())
			st := &signoff.Statement{Kind: signoff.InForce, Revision: commitOf("a"), Content: treeOf("a"), Policy: ordinary().hash(), Since: day(1), Corrects: CorrectsNothing, Role: InServiceRole}
			if c.edit != nil {
				c.edit(st)
			}
			err := s.record(chain.InForce, s.sign(st, c.key, InForceFormat))
			if c.refuse == "" {
				s.must(err)
				if len(s.line.InForce()) != 1 {
					t.Error("it does not count")
				}
				return
			}
			s.refused(err, c.refuse)
			if len(s.line.InForce()) != 0 || len(s.line.Standing(".")) != 0 {
				t.Error("it counts all the same")
			}
		})
	}
}

// For one route and instant there is one answer.
func TestInForceConflicts(t *testing.T) {
	for name, c := range map[string]struct {
		first, second string // routes
		since         time.Time
		conflict      bool
	}{
		"all and all":               {"all", "all", day(1), true},
		"all and one":               {"all", "R1", day(1), true},
		"one and all":               {"R1", "all", day(1), true},
		"one and the same":          {"R1", "R1", day(1), true},
		"one of several":            {"R1,R2", "R2,R3", day(1), true},
		"other routes":              {"R1,R2", "R3", day(1), false},
		"another instant":           {"all", "all", day(1).Add(time.Second), false},
		"the instant in other form": {"all", "all", day(1).In(time.FixedZone("", 3600)), true},
	} {
		t.Run(name, func(t *testing.T) {
			s := anchored(t, ordinary())
			s.must(s.inForce("a", day(1), c.first, CorrectsNothing))
			err := s.inForce("b", c.since, c.second, CorrectsNothing)
			if c.conflict {
				s.refused(err, "entry 3 says already what is in force from 2026-03-01T03:00:00Z; replace or void it")
			} else {
				s.must(err)
			}
		})
	}
}

func TestInForceCorrections(t *testing.T) {
	s := anchored(t, ordinary())
	at := func(when time.Time, route string) string {
		now, _ := s.line.InForceAt(".", route, when)
		if now == nil {
			return ""
		}
		for _, name := range []string{"a", "b", "c"} {
			if now.Content == treeOf(name) {
				return name
			}
		}
		return "?"
	}
	want := func(step string, when time.Time, answer string) {
		t.Helper()
		if got := at(when, "R1"); got != answer {
			t.Errorf("%s: in force is %q, want %q", step, got, answer)
		}
	}
	s.must(s.inForce("a", day(1), "all", CorrectsNothing)) // 3
	s.must(s.inForce("b", day(5), "all", CorrectsNothing)) // 4
	want("recorded", day(5), "b")
	s.must(s.inForce("c", day(5), "all", "replaces 4")) // 5: at the same instant
	want("replaced", day(5), "c")
	s.refused(s.inForce("b", day(7), "all", "replaces 4"), "entry 4 is no in-force record that stands") // 6
	s.refused(s.inForce("b", day(5), "all", "voids 4"), "entry 4 is no in-force record that stands")    // 7
	s.must(s.inForce("c", day(6), "all", "replaces 5"))                                                 // 8: at another
	want("put off", day(5), "a")
	want("put off", day(6), "c")
	s.refused(s.inForce("b", day(1), "all", "replaces 8"), "entry 3 says already") // 9
	s.must(s.inForce("c", day(6), "all", "voids 8"))                               // 10
	want("voided", day(6), "a")
	s.refused(s.inForce("c", day(6), "all", "voids 10"), "entry 10 is no in-force record") // 11: a voiding does not stand itself
	s.must(s.inForce("b", day(6), "all", CorrectsNothing))                                 // 12: the instant is free again
	want("recorded anew", day(6), "b")
	if n := len(s.line.Standing(".")); n != 2 {
		t.Errorf("%d records stand", n)
	}
	if n := len(s.line.InForce()); n != 6 {
		t.Errorf("%d records count", n)
	}
}

func TestInForceAt(t *testing.T) {
	s := anchored(t, ordinary())
	s.must(s.inForce("b", day(10), "R1,R2", CorrectsNothing)) // recorded out of order
	s.must(s.inForce("a", day(1), "all", CorrectsNothing))
	s.must(s.inForce("c", day(20), "all", CorrectsNothing))
	s.must(s.inForce("d", day(30), "R2", CorrectsNothing))
	for _, c := range []struct {
		route       string
		at          time.Time
		now, before string
	}{
		{"R1", day(1).Add(-time.Second), "", ""},
		{"R1", day(1), "a", ""},
		{"R1", day(10).Add(-time.Second), "a", ""},
		{"R1", day(10), "b", "a"},
		{"R3", day(10), "a", ""},
		{"", day(10), "a", ""},
		{"R1", day(20), "c", "b"},
		{"R3", day(20), "c", "a"},
		{"R2", day(30), "d", "c"},
		{"R1", day(30), "c", "b"},
		{"R2", day(31), "d", "c"},
	} {
		now, before := s.line.InForceAt(".", c.route, c.at)
		for what, pair := range map[string]struct {
			got  *Record
			want string
		}{"now": {now, c.now}, "before": {before, c.before}} {
			if (pair.got == nil) != (pair.want == "") || pair.got != nil && pair.got.Content != treeOf(pair.want) {
				t.Errorf("%s at %s: %s is %v, want %q", c.route, c.at, what, pair.got, pair.want)
			}
		}
	}
	if now, before := s.line.InForceAt("data", "R1", day(31)); now != nil || before != nil {
		t.Error("another folder is in force as well")
	}
}

// Approved assessments lead from one content to another or do not.
func TestLed(t *testing.T) {
	s := anchored(t, ordinary())
	for _, pair := range []string{"a-b", "b-c", "a-d", "c-e", "d-e"} {
		n := s.assess(pair[:1], pair[2:], ordinary(), ordinary(), nil)
		if pair != "d-e" {
			s.approve(n)
		}
	}
	for way, want := range map[string]bool{
		"aa": true, "ab": true, "ac": true, "ad": true, "ae": true, "bc": true, "be": true, "ce": true, "bb": true,
		"ba": false, "db": false, "bd": false, "de": false, "ca": false, "xx": false, "xa": false, "ax": false, "xb": false,
	} {
		if got := s.line.Led(".", treeOf(way[:1]), treeOf(way[1:])); got != want {
			t.Errorf("from %s to %s: %v", way[:1], way[1:], got)
		}
		if s.line.Led("data", treeOf(way[:1]), treeOf(way[1:])) {
			t.Errorf("from %s to %s in a folder without an anchor", way[:1], way[1:])
		}
	}
	s.must(s.signOff(s.names[". b-c"], "bea", "approver", "reject"))
	if s.line.Led(".", treeOf("a"), treeOf("c")) || s.line.Led(".", treeOf("b"), treeOf("e")) {
		t.Error("a rejected assessment leads on")
	}
}
