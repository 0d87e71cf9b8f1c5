package main

import (
	"strings"
	"testing"
	"time"
)

// The first second of 1970 is a time, wherever a trace writes it: no place of the
// document takes it for none (TestNoTime has those).
func TestTraceOfSecondZero(t *testing.T) {
	repo := composed(t, t.TempDir(), []int{60, 80, 85}, []time.Time{time.Unix(0, 0).UTC(), time.Unix(0, 0).UTC(), time.Unix(86400, 0).UTC()})
	for name, asked := range map[string][]string{"line": {"--at", "1.5"}, "bands": {"--from", "1", "--to", "3"}} {
		got := call(t, append([]string{"--repo", repo, "trace", "c2", "--route", "R1", "--format", "json"}, asked...)...).want(t, 0)
		if strings.Contains(got.out, `"committed": ""`) {
			t.Errorf("%s: a commit without a time: %s", name, got.out)
		}
	}
}
