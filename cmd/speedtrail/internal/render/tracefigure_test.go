package render

import (
	"slices"
	"strings"
	"testing"
)

// Two revisions of one day are told apart at the axes of a trace.
func TestTraceTimes(t *testing.T) {
	instants := []string{"2026-03-01T08:00:00Z", "2026-03-02T08:00:00Z", "2026-03-02T09:30:00Z", "2026-03-02T09:30:07Z", "", "2026-03-04T09:30:00Z"}
	want := []string{"2026-03-01", "2026-03-02 08:00", "2026-03-02 09:30:00", "2026-03-02 09:30:07", "", "2026-03-04"}
	if got := distinct(instants); !slices.Equal(got, want) {
		t.Errorf("%q", got)
	}
	trace := &Trace{
		Revision:  TraceRevision{Committed: "2026-03-02T15:00:00Z"},
		Trails:    []TraceTrail{{Line: []TraceReign{{Committed: "2026-03-02T08:00:00Z", Speed: 60}, {Committed: "2026-03-02T14:30:00Z", Speed: 80}}}},
		Stretches: []TraceStretch{{Bands: []TraceBand{{Committed: "2026-03-02T08:00:00Z", Pieces: []TraceLevel{{End: 10, Speed: 60}}}, {Committed: "2026-03-02T14:30:00Z", Pieces: []TraceLevel{{End: 10, Speed: 80}}}}}},
	}
	for _, svg := range []string{trace.timeChart(&trace.Trails[0], "a"), trace.distanceChart(&trace.Stretches[0], "a")} {
		for _, day := range []string{">2026-03-02 08:00<", ">2026-03-02 14:30<"} {
			if !strings.Contains(svg, day) {
				t.Errorf("no %s in %s", day, svg)
			}
		}
	}
}
