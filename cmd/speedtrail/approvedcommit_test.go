package main

import (
	"fmt"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// A content that was approved twice, and left in between: preparers of the next change
// are counted from the newest of its approved commits, also where the base is yet
// another commit of that content.
func TestPreparersSinceTheNewestApproval(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	var times []time.Time
	for i := range 6 {
		times = append(times, at.Add(time.Duration(i)*time.Hour))
	}
	repo := composed(t, keys, []int{60, 80, 100, 80, 80, 90}, times)
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	for i, base := range []string{"c0", "c1", "c2"} {
		if got := call(t, in("assess", base, fmt.Sprintf("c%d", i+1))...); got.status > statusFinding {
			t.Fatalf("%s: %s", base, got.errors)
		}
		for _, s := range [][2]string{{"checker", "ada"}, {"approver", "bea"}} {
			call(t, in("sign", fmt.Sprint(i+1), "--role", s[0], "--decision", "approve", "--reason", "looked at it", "--key", key(s[1]), "-y")...).want(t, 0)
		}
	}
	got := call(t, in("assess", "c4", "c5", "--format", "json")...)
	c1, c3 := gitIn(t, repo, "rev-parse", "c1^{commit}"), gitIn(t, repo, "rev-parse", "c3^{commit}")
	if !strings.Contains(got.out, `"prepared_since": "`+c3+`"`) || c1 == c3 {
		t.Errorf("counted from c1: %v, want c3\n%.300s%s", strings.Contains(got.out, `"prepared_since": "`+c1+`"`), got.out, got.errors)
	}
}
