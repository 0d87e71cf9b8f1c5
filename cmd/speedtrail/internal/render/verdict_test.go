package render

import (
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// What temporary restrictions hide today has a clause of its own in the verdict.
func TestVerdictOnHidden(t *testing.T) {
	change := func(before, after int, length int64) assessment.Change {
		return assessment.Change{Before: before, After: after, Length: length, Trains: []int{0}}
	}
	for _, x := range []struct {
		name            string
		changes, masked []assessment.Change
		want            string
	}{
		{"all hidden", nil, []assessment.Change{change(100, 120, 10_000_000), change(100, 110, 12_000_000)},
			"The only reference train is neither faster nor slower anywhere on the only route of the target. Hidden today by temporary restrictions: raised by up to 20 km/h over 10.000 km on A (N)."},
		{"some hidden, up and down", []assessment.Change{change(100, 110, 1_000_000)}, []assessment.Change{change(100, 120, 2_000_000), change(100, 70, 500_000)},
			"1 of 1 train changes on 1 of 1 route: raised by up to 10 km/h over 1.000 km on A (N). Hidden today by temporary restrictions: raised by up to 20 km/h over 2.000 km on A (N), lowered by up to 30 km/h over 0.500 km on A (N)."},
	} {
		t.Run(x.name, func(t *testing.T) {
			train := assessment.Train{ID: "N", Fate: "kept"}
			if x.changes != nil {
				train.Routes = []string{"A"}
			}
			d := &assessment.Document{Computed: assessment.Computed{Trains: []assessment.Train{train}, Routes: []assessment.Route{{ID: "A", Changes: x.changes, Masked: x.masked}}}}
			if got := Verdict(d); got != x.want {
				t.Errorf("got  %s\nwant %s", got, x.want)
			}
		})
	}
}

// All trains of the largest step are named, whatever rows bring it to them.
func TestVerdictOnExtremes(t *testing.T) {
	change := func(train, after int, length int64) assessment.Change {
		return assessment.Change{Before: 100, After: after, Length: length, Trains: []int{train}}
	}
	c := &assessment.Computed{
		Trains: []assessment.Train{{ID: "A", Fate: "kept"}, {ID: "B", Fate: "kept"}, {ID: "C", Fate: "kept"}},
		Routes: []assessment.Route{
			{ID: "R", Changes: []assessment.Change{change(2, 120, 3000000), change(0, 120, 3000000), change(1, 120, 2000000), change(1, 110, 9000000), change(0, 120, 3000000)}},
			{ID: "S", Changes: []assessment.Change{change(1, 110, 9000000)}},
			{ID: "T", Changes: []assessment.Change{change(2, 120, 3000000)}},
		},
	}
	if got, want := extremes(c, func(r *assessment.Route) []assessment.Change { return r.Changes }), "raised by up to 20 km/h over 3.000 km on R, T (A, C)"; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
}

// An id with a colon does not cut a finding short.
func TestCutTail(t *testing.T) {
	for _, x := range [][3]string{{"raised (A: B): nobody asked", "raised (A: B)", "nobody asked"}, {"raised", "raised", ""}} {
		if head, tail := cutTail(x[0]); head != x[1] || tail != x[2] {
			t.Errorf("%q: got %q, %q", x[0], head, tail)
		}
	}
}

// Of a long clause the trains go, and nothing else.
func TestWithoutTrains(t *testing.T) {
	many := strings.Repeat("T01 (up), ", 20) + "T02"
	for _, x := range [][2]string{
		{"raised by up to 5 km/h, 30 to 35 (A, B), hidden today", "raised by up to 5 km/h, 30 to 35 (A, B), hidden today"},
		{"raised by up to 5 km/h, 30 to 35 (" + many + "), hidden today", "raised by up to 5 km/h, 30 to 35, hidden today"},
		{strings.Repeat("word ", 40), strings.Repeat("word ", 40)},
	} {
		if got := withoutTrains(x[0]); got != x[1] {
			t.Errorf("%q: got %q", x[0], got)
		}
	}
}

// What a declaration has seen keeps apart what is hidden today.
func TestSeenWords(t *testing.T) {
	for _, x := range []struct {
		want string
		seen []assessment.Seen
	}{
		{"N 2.000 km", []assessment.Seen{{Train: "N", Inside: 2_000_000}}},
		{"N 20.000 km hidden today", []assessment.Seen{{Train: "N", Hidden: 20_000_000}}},
		{"N 2.000 km and 0.400 km of run-out, 1.000 km hidden today; M 2.000 km", []assessment.Seen{
			{Train: "N", Inside: 2_000_000, RunOut: 400_000, Hidden: 1_000_000}, {Train: "M", Inside: 2_000_000}}},
		{"N, M 1.000 km hidden today", []assessment.Seen{{Train: "N", Hidden: 1_000_000}, {Train: "M", Hidden: 1_000_000}}},
	} {
		if got := seenWords(assessment.Declaration{Seen: x.seen}); got != x.want {
			t.Errorf("got  %s\nwant %s", got, x.want)
		}
	}
}

// A reference train that differs and that no request names is not inside what they
// declare.
func TestVerdictOnTrains(t *testing.T) {
	trains := func(n int) (list []assessment.Finding) {
		for range n {
			list = append(list, assessment.Finding{ID: assessment.TrainsChanged, Text: "reference train N is altered"})
		}
		return list
	}
	outside := assessment.Finding{ID: assessment.Outside, Route: "A", From: "1.000", To: "2.000", Text: "raised: no declaration"}
	one := []assessment.Request{{ID: "CR-1"}}
	for _, x := range []struct {
		name     string
		requests []assessment.Request
		findings []assessment.Finding
		want     string
	}{
		{"declared", one, nil, "Everything is inside what CR-1 declares."},
		{"one train", one, trains(1), "Everything else is inside what CR-1 declares. 1 reference train differs and is not declared."},
		{"two trains", one, trains(2), "Everything else is inside what CR-1 declares. 2 reference trains differ and are not declared."},
		{"a train beside a change", one, append(trains(1), outside), "1 change lies outside what CR-1 declares. First: A, km 1.000 to 2.000, raised. 1 reference train differs and is not declared."},
		{"nothing asked for", nil, trains(1), "1 reference train differs and is not declared."},
		{"nothing asked for, a change", nil, append(trains(1), outside), "No change request declares any of it. First: A, km 1.000 to 2.000, raised."},
		{"a declaration that is not seen", one, append(trains(1), assessment.Finding{ID: assessment.Unseen}), "1 reference train differs and is not declared. 1 declaration is not seen."},
	} {
		t.Run(x.name, func(t *testing.T) {
			if got := outsideSentence(&assessment.Computed{Requests: x.requests, Findings: x.findings}); got != x.want {
				t.Errorf("got  %s\nwant %s", got, x.want)
			}
		})
	}
}

// What no reference train sees is in the verdict where it is the larger step.
func TestVerdictOnUnseen(t *testing.T) {
	seen := func(represented bool, before, after int) assessment.FleetChange {
		return assessment.FleetChange{Before: before, After: after, Members: []assessment.FleetPart{{Represented: represented}}}
	}
	for _, x := range []struct {
		name      string
		changes   []assessment.Change
		fleet     []assessment.FleetChange
		permanent bool
		want      string
	}{
		{"nobody else", nil, []assessment.FleetChange{seen(false, 110, 170)}, false, "Trains that no reference train stands for: raised by up to 60 km/h on A."},
		{"larger", []assessment.Change{{Before: 100, After: 130}}, []assessment.FleetChange{seen(false, 110, 170), seen(false, 110, 90)}, false,
			"Trains that no reference train stands for: raised by up to 60 km/h on A, lowered by up to 20 km/h on A."},
		{"no larger", []assessment.Change{{Before: 100, After: 160}}, []assessment.FleetChange{seen(false, 110, 170)}, false, ""},
		{"represented", nil, []assessment.FleetChange{seen(true, 110, 170)}, false, ""},
		{"hidden today", nil, []assessment.FleetChange{seen(false, 110, 170)}, true, ""},
	} {
		c := &assessment.Computed{Routes: []assessment.Route{{ID: "A", Changes: x.changes}}, Fleet: []assessment.Fleet{{Route: "A", Permanent: x.permanent, Changes: x.fleet}}}
		if got := unseenSentence(c); got != x.want {
			t.Errorf("%s: got %q, want %q", x.name, got, x.want)
		}
	}
}
