package main

import (
	"encoding/json"
	"path/filepath"
	"strings"
	"testing"
	"time"
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
