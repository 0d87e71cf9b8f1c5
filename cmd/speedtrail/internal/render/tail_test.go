package render

import (
	"testing"

	"speedtrail/diff/doubt"
	"speedtrail/history/assessment"
)

// What many findings end with is said once, but no part of a name.
func TestCommonTail(t *testing.T) {
	for _, x := range []struct {
		id, text    string
		n           int
		first, tail string
	}{
		{assessment.Outside, "raised: no change request is in play", 9, "raised", " Of each: no change request is in play."},
		{assessment.Outside, "raised: no change request is in play", 8, "raised: no change request is in play", ""},
		{doubt.DelayOverBridge, "a train whose rear can still be on Tarn: long bridge", 9, "a train whose rear can still be on Tarn: long bridge", ""},
		{doubt.StepSize, "120 and 60 km/h meet, a step of more than 40 (CAR: 1)", 9, "120 and 60 km/h meet, a step of more than 40 (CAR: 1)", ""},
	} {
		g := findingGroup{ID: x.id}
		for range x.n {
			g.List = append(g.List, assessment.Finding{ID: x.id, Text: x.text})
		}
		texts, tail := g.commonTail(mostWholeFinding)
		if len(texts) != x.n || texts[0] != x.first || tail != x.tail {
			t.Errorf("%d of %s: %q and %q, want %q and %q", x.n, x.id, texts, tail, x.first, x.tail)
		}
	}
}
