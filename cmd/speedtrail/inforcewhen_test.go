package main

import (
	"encoding/json"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/approval"
	"speedtrail/history/signoff"
)

// What is recorded for an instant that is still to come is not shown as what was.
func TestInForceInTheFuture(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	ask := func(when time.Time, args ...string) {
		t.Helper()
		future := when.After(time.Now())
		args = append([]string{"inforce", "--when", when.UTC().Format(time.RFC3339)}, args...)
		got := call(t, in(args...)...).want(t, 0)
		if strings.HasPrefix(got.out, "! "+when.UTC().Format(time.RFC3339)+" lies in the future") != future || strings.Contains(got.out, "lies in the future") != future {
			t.Errorf("%q: %s", args, got.out)
		}
		var answer struct {
			Future *bool `json:"in_future"`
		}
		if err := json.Unmarshal([]byte(call(t, in(append(args, "--format", "json")...)...).out), &answer); err != nil || answer.Future == nil || *answer.Future != future {
			t.Errorf("%q: %v, %v", args, answer.Future, err)
		}
	}
	ahead := time.Now().Add(48 * time.Hour).Truncate(time.Second)
	ask(ahead) // nothing is recorded
	call(t, in("inforce", "record", "c0", "--since", "2026-03-03T00:00:00Z", "--reason", "start", "--key", key("cem"), "-y")...).want(t, 0)
	ask(ahead)
	ask(ahead, "--route", "R1", "--at", "1.5")
	if got := call(t, in("inforce", "--when", "2026-03-04T00:00:00Z", "--route", "R1", "--at", "1.5")...); !strings.Contains(got.out, "Temporary restrictions count from valid_from to valid_to alone") {
		t.Errorf("what is counted is not said:\n%s", got.out)
	}
	if got := call(t, in("profile", "--route", "R9", "--train", "T")...); !strings.Contains(got.errors, "another revision, as REV, can have had others") {
		t.Errorf("a route that is gone: %s", got.errors)
	}
	ask(time.Now().Add(-time.Hour).Truncate(time.Second))
}

// The speed at an instant is that with the temporary restrictions of then, from the
// first instant of their terms up to the last; the last point of a route has its row.
func TestInForceTerms(t *testing.T) {
	_, in, key := aLedger(t)
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("inforce", "record", "c0", "--since", "2019-06-01T00:00:00Z", "--reason", "start", "--key", key("cem"), "-y")...).want(t, 0)
	for _, c := range []struct {
		when, at string
		speed    int
		row      string
	}{
		{"2019-12-31T23:59:59Z", "3.5", 100, "speed.csv:4"}, {"2020-01-01T00:00:00Z", "3.5", 40, "temporary.csv:2"},
		{"2029-12-31T23:59:59Z", "3.5", 40, "temporary.csv:2"}, {"2030-01-01T00:00:00Z", "3.5", 100, "speed.csv:4"},
		{"2026-03-04T00:00:00Z", "1.5", 60, "speed.csv:3"}, {"2026-03-04T00:00:00Z", "5", 100, "speed.csv:4"},
	} {
		got := call(t, in("inforce", "--when", c.when, "--route", "R1", "--at", c.at, "--format", "json")...).want(t, 0)
		var answer struct {
			Speeds []struct {
				Speed    int      `json:"speed_kmh"`
				Governed []string `json:"governed_by"`
			} `json:"speeds"`
		}
		if err := json.Unmarshal([]byte(got.out), &answer); err != nil || len(answer.Speeds) != 2 {
			t.Fatalf("%v: %s", err, got.out)
		}
		for _, x := range answer.Speeds {
			if x.Speed != c.speed || len(x.Governed) != 1 || !strings.Contains(x.Governed[0], c.row) {
				t.Errorf("at km %s on %s: %+v, want %d by %s", c.at, c.when, x, c.speed, c.row)
			}
		}
	}
}

// A record that was corrected would be the answer where it had begun by then, not before
// the one that is, on the route that is asked for.
func TestSaidOtherwise(t *testing.T) {
	day := func(n int) time.Time { return time.Date(2026, 3, n, 0, 0, 0, 0, time.UTC) }
	record := func(since int, routes ...string) approval.Record {
		return approval.Record{Statement: signoff.Statement{Since: day(since), Routes: routes}}
	}
	now := record(5)
	for _, c := range []struct {
		name  string
		r     approval.Record
		now   *approval.Record
		route string
		want  bool
	}{
		{"the whole network, any route", record(6), &now, "", true}, {"the whole network, one route", record(6), &now, "R1", true},
		{"its route", record(6, "R2", "R1"), &now, "R1", true}, {"another route", record(6, "R2"), &now, "R1", false}, {"one route, any", record(6, "R2"), &now, "", true},
		{"from the same instant", record(5), &now, "R1", true}, {"before the answer", record(4), &now, "R1", false}, {"without an answer", record(4), nil, "R1", true},
		{"from that instant on", record(10), &now, "R1", true}, {"later", record(11), &now, "R1", false}, {"later, without an answer", record(11), nil, "", false},
	} {
		if got := saidOtherwise(c.r, c.now, day(10), c.route); got != c.want {
			t.Errorf("%s: %t", c.name, got)
		}
	}
}
